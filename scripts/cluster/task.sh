#!/bin/bash
# SPDX-License-Identifier: GPL-3.0-or-later
# One task of a job array; submit.sh starts it. Two minutes before its time is up the scheduler sends
# SIGUSR1: the program stops cleanly (exit code 7) and the task goes back to the queue, to continue.
#SBATCH --job-name=selvedge-task
#SBATCH --ntasks=1
#SBATCH --cpus-per-task=4
#SBATCH --time=04:00:00
#SBATCH --signal=B:USR1@120
#SBATCH --requeue
#SBATCH --open-mode=append
set -eu
sheet=$1 run=$2 count=$3 # not SLURM_ARRAY_TASK_COUNT: some tasks may be submitted again
task=$SLURM_ARRAY_TASK_ID

"${SELVEDGE:-selvedge}" average "$sheet" -o "$run.parts/$task" --task "$task/$count" \
    -j "${SLURM_CPUS_PER_TASK:-1}" -q &
worker=$!
signalled=1
trap 'signalled=1; kill -USR1 "$worker"; trap "" USR1 TERM' USR1 TERM
while [ "$signalled" = 1 ]; do # a signal ends the wait, not the program
    signalled=0
    code=0
    wait "$worker" || code=$?
done
if [ "$code" -eq 7 ]; then
    scontrol requeue "${SLURM_ARRAY_JOB_ID}_$task"
fi
exit "$code"

#!/bin/bash
# SPDX-License-Identifier: GPL-3.0-or-later
# An ensemble as one MPI job: sbatch mpi.sh SHEET RUN
# LAUNCHER may be set, for instance to "srun --mpi=pmix --kill-on-bad-exit=1".
#SBATCH --job-name=selvedge
#SBATCH --ntasks=64
#SBATCH --cpus-per-task=1
#SBATCH --time=04:00:00
#SBATCH --signal=B:USR1@120
#SBATCH --requeue
#SBATCH --open-mode=append
set -eu
sheet=$1 run=$2
read -r -a launcher <<<"${LAUNCHER:-mpirun}"

"${launcher[@]}" "${SELVEDGE:-selvedge}" average "$sheet" -o "$run" \
    -j "${SLURM_CPUS_PER_TASK:-1}" &
worker=$!
signalled=1
trap 'signalled=1; kill -USR1 "$worker"; trap "" USR1 TERM' USR1 TERM
while [ "$signalled" = 1 ]; do # a signal ends the wait, not the job
    signalled=0
    code=0
    wait "$worker" || code=$?
done
if [ "$code" -eq 7 ]; then
    scontrol requeue "$SLURM_JOB_ID"
fi
exit "$code"

#!/bin/bash
# SPDX-License-Identifier: GPL-3.0-or-later
# Submits an ensemble as a job array of N tasks and a merge that waits for all of them.
#   submit.sh SHEET RUN N [OPTION OF SBATCH...]
# To have tasks 3 and 7 done again: submit.sh SHEET RUN N --array=3,7
# Choose N so that a task works for half an hour or more: very short ones burden the scheduler.
set -eu
if [ $# -lt 3 ]; then
    echo "usage: ${0##*/} SHEET RUN N [OPTION OF SBATCH...]" >&2
    exit 2
fi
sheet=$1 run=$2 count=$3
shift 3
here=$(cd "$(dirname "$0")" && pwd)
mkdir -p "$run.parts"
array=$(sbatch --parsable --array="1-$count" "$@" "$here/task.sh" "$sheet" "$run" "$count")
sbatch --dependency="afterok:${array%%;*}" "$here/merge.sh" "$run"

#!/bin/bash
# SPDX-License-Identifier: GPL-3.0-or-later
# An ensemble in N tasks over the cores of one machine or allocation, by GNU parallel, and the merge.
#   parallel.sh SHEET RUN N
# Called again, it does the tasks that have failed or were stopped, and continues each.
set -eu
if [ $# -ne 3 ]; then
    echo "usage: ${0##*/} SHEET RUN N" >&2
    exit 2
fi
sheet=$1 run=$2 count=$3
selvedge=${SELVEDGE:-selvedge}
mkdir -p "$run.parts"
seq 1 "$count" |
    parallel -q --jobs "${JOBS:-$(nproc)}" --joblog "$run.parts/joblog" --resume-failed \
        "$selvedge" average "$sheet" -o "$run.parts/{}" --task "{}/$count" -j 1 -q
exec "$selvedge" merge "$run" "$run".parts/*/

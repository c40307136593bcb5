#!/bin/bash
# SPDX-License-Identifier: GPL-3.0-or-later
# Joins the parts of all tasks; submit.sh makes it wait for them. May be run again at any time.
#SBATCH --job-name=selvedge-merge
#SBATCH --ntasks=1
#SBATCH --time=00:30:00
set -eu
run=$1
exec "${SELVEDGE:-selvedge}" merge "$run" "$run".parts/*/

# SPDX-License-Identifier: GPL-3.0-or-later
"""Job scripts of scripts/cluster: run for real by a scheduler of our own that starts what it is given at
once, and by GNU parallel."""
import functools
import glob
import os
import shutil

from harness import check, contains, equal, folder, main, read, run, run_any, source, test, write

SHEET = """\
selvedge: 1
title: Job scripts
model: {name: qi_wu_zhang, m: -1}
flake: {shape: rectangle, cells: [5, 5]}
disorder: [{name: pot, kind: onsite, distribution: box, width: 4, per: cell}]
markers: {local_chern: {window: 0.5}}
ensemble: {realisations: 11, seed: 5}
"""
# Starts the script for each index of --array, in order; what asks to be queued again is started again.
# $SCHEDULER/signal, if there, names a ledger: as soon as that exists, the job that made it gets SIGUSR1.
SBATCH = r"""#!/bin/bash
set -u
indices=none job=$((RANDOM % 1000 + 100))
while [ "${1#--}" != "$1" ]; do
    case $1 in
    --array=*-*) range=${1#--array=}; indices=$(seq "${range%-*}" "${range#*-}") ;;
    --array=*) indices=$(echo "${1#--array=}" | tr , ' ') ;;
    esac
    echo "$1" >>"$SCHEDULER/options"
    shift
done
grep -q '^#SBATCH --time=' "$1" || { echo "no time limit" >&2; exit 1; }
failed=0
for index in $indices; do
    export SLURM_JOB_ID=$job SLURM_CPUS_PER_TASK=1
    if [ "$index" != none ]; then
        export SLURM_ARRAY_JOB_ID=$job SLURM_ARRAY_TASK_ID=$index
    fi
    while :; do
        rm -f "$SCHEDULER/again"
        bash "$@" >>"$SCHEDULER/output" 2>&1 &
        shell=$!
        if [ -e "$SCHEDULER/signal" ] && { [ "$index" = 2 ] || [ "$index" = none ]; }; then
            while kill -0 "$shell" && [ ! -s "$(cat "$SCHEDULER/signal")" ]; do sleep 0.02; done
            rm "$SCHEDULER/signal"
            kill -USR1 "$shell"
        fi
        wait "$shell" || { [ -e "$SCHEDULER/again" ] || failed=1; }
        [ -e "$SCHEDULER/again" ] || break
    done
done
echo "$job"
exit "$failed"
"""
SCONTROL = r"""#!/bin/bash
echo "$*" >>"$SCHEDULER/requeued"
touch "$SCHEDULER/again"
"""


@functools.lru_cache(maxsize=None)
def alone(text=SHEET):
    top = folder()
    path, place = write(os.path.join(top, "sheet.yaml"), text), os.path.join(top, "run")
    return run("average", path, "-o", place, "--json", code=0).json()["points"]


class Cluster:
    """A folder with a sheet, our scheduler on PATH, and a run to be made."""

    def __init__(self, text=SHEET):
        self.top = os.path.join(folder(), "with space")
        os.mkdir(self.top)
        self.sheet, self.run = write(os.path.join(self.top, "sheet.yaml"), text), os.path.join(self.top, "run")
        for name, body in (("sbatch", SBATCH), ("scontrol", SCONTROL)):
            os.chmod(write(os.path.join(self.top, name), body), 0o755)

    def start(self, script, *arguments, code=0, **variables):
        env = {"PATH": self.top + ":" + os.environ["PATH"], "SCHEDULER": self.top, **variables}
        done = run_any(["bash", source("scripts", "cluster", script), *arguments], env=env, timeout=200)
        output = os.path.join(self.top, "output")
        check(done.code == code, "%s: exit code %d\n%s%s" % (
            script, done.code, done.err, read(output) if os.path.exists(output) else ""))
        return done

    def points(self):
        return run("average", self.sheet, "-o", self.run, "--json", code=0).json()["points"]


@test
def an_array_and_its_merge():
    c = Cluster()
    c.start("submit.sh", c.sheet, c.run, "3")
    check(os.path.exists(os.path.join(c.run, "points.csv")), "the merge made no points")
    equal(c.points(), alone(), "points")
    contains(read(os.path.join(c.top, "options")), "--dependency=afterok:", "options of the merge")
    shutil.rmtree(c.run)
    shutil.rmtree(os.path.join(c.run + ".parts", "2"))
    c.start("submit.sh", c.sheet, c.run, "3", "--array=2")
    equal(c.points(), alone(), "one task done again")


LONG = SHEET.replace("[5, 5]", "[14, 14]").replace("realisations: 11", "realisations: 120")


@test
def a_task_that_is_signalled_goes_back_to_the_queue():
    c = Cluster(LONG)
    write(os.path.join(c.top, "signal"), os.path.join(c.run + ".parts", "2", "ledger.sqlite"))
    c.start("submit.sh", c.sheet, c.run, "2")
    contains(read(os.path.join(c.top, "requeued")), "requeue", "calls of scontrol")
    contains(read(os.path.join(c.top, "requeued")), "_2", "calls of scontrol")
    equal(c.points(), alone(LONG), "points")


@test
def a_job_of_ranks():
    if shutil.which("mpirun") is None or not run("info", "--json").json().get("mpi"):
        print("# no MPI: not tried")
        return
    c = Cluster(LONG)
    write(os.path.join(c.top, "signal"), os.path.join(c.run, "ledger.sqlite"))
    mpi = {"OMPI_ALLOW_RUN_AS_ROOT": "1", "OMPI_ALLOW_RUN_AS_ROOT_CONFIRM": "1", "OMPI_MCA_btl": "self,vader",
           "OMPI_MCA_rmaps_base_oversubscribe": "1", "OMPI_MCA_plm_rsh_agent": "", "LAUNCHER": "mpirun -n 2"}
    done = run_any(["sbatch", source("scripts", "cluster", "mpi.sh"), c.sheet, c.run], timeout=200,
                   env={"PATH": c.top + ":" + os.environ["PATH"], "SCHEDULER": c.top, **mpi})
    check(os.path.exists(os.path.join(c.top, "requeued")), "the job was not queued again after the signal")
    equal(done.code, 0, "exit code of the job\n" + done.err + read(os.path.join(c.top, "output")))
    equal(c.points(), alone(LONG), "points")


@test
def gnu_parallel():
    if shutil.which("parallel") is None:
        print("# no GNU parallel: not tried")
        return
    c = Cluster()
    c.start("parallel.sh", c.sheet, c.run, "3", JOBS="2")
    equal(c.points(), alone(), "points")
    before = read(os.path.join(c.run + ".parts", "joblog"))
    c.start("parallel.sh", c.sheet, c.run, "3", JOBS="2")
    equal(read(os.path.join(c.run + ".parts", "joblog")), before, "tasks done twice")


@test
def scripts_are_sound():
    scripts = sorted(glob.glob(source("scripts", "cluster", "*.sh")))
    check(len(scripts) == 5, "%d scripts" % len(scripts))
    for script in scripts:
        equal(run_any(["bash", "-n", script]).code, 0, "syntax of " + script)
    if shutil.which("shellcheck") is None:
        print("# no shellcheck: not tried")
        return
    found = run_any(["shellcheck", *scripts])
    check(found.code == 0, found.out)


main()

#!/usr/bin/env python3
# SPDX-License-Identifier: BSD-2-Clause
"""A sweep in a real batch queue: signalled before its limit, requeued, its ranks killed, submitted again, finished. The
table is compared with that of an uninterrupted sweep, bit for bit: every case has a rank of its own. An array of two models; a
chain of two links, the first of them signalled; a job's end taken from $SLURM_JOB_END_TIME. Program: $EBBTURN. Slurm
is a private one (scripts/cluster/local-slurm.sh); where it is not installed or cannot run the test says so and is skipped."""
import os
import subprocess
import sys
import tempfile
import time

import h5py
import numpy as np
from checkpoints import MODES, checkpoints, end, same, start
from checkpoints import prepare as prepare_model
from common import PROGRAM, check, finish

CLUSTER = os.path.join(os.path.dirname(os.path.abspath(__file__)), "..", "..", "scripts", "cluster")
LOCAL, JOB = os.path.join(CLUSTER, "local-slurm.sh"), os.path.join(CLUSTER, "job.sh")
MODEL = """gravity: {prescription: slqc}
clock: {kind: scalar, from: -0.5, to: 0.5, samples: 41}
state: {profile: gaussian_momentum, momentum: 200.0, relative_spread: 0.08}
output: {keep: [moments, quantiles]}
"""
PLAN = """base: model.yaml
vary:
  state.momentum: {from: 150, to: 250, count: 30}
output: {file: table.h5}
"""
CREDENTIAL = 4  # seconds: Slurm refuses to start a requeued job again before the credential of its first run has expired
LONG = dict(MODES, momentum=200, volume_max="1.0e+5", samples=801, keep="[moments, quantiles]", every="1s")
RECORD = 1300  # a record of the journal is a little shorter; two records a case


def slurm(*words):
    return subprocess.run(words, capture_output=True, text=True, timeout=60, check=False).stdout.strip()


def state(job):
    words = slurm("scontrol", "show", "job", job).split()
    return next((w.split("=")[1] for w in words if w.startswith("JobState=")), "GONE")


def wait_for(condition, seconds=120):
    deadline = time.monotonic() + seconds
    while time.monotonic() < deadline:
        if condition():
            return True
        time.sleep(0.1)
    return False


def journal(folder):
    return sum(os.path.getsize(os.path.join(folder, n)) for n in os.listdir(folder) if "journal" in n)


def prepare(folder):
    os.makedirs(folder)
    for name, text in (("model.yaml", MODEL), ("plan.yaml", PLAN)):
        with open(os.path.join(folder, name), "w", encoding="utf-8") as f:
            f.write(text)


def submit(folder):
    return slurm("sbatch", "--parsable", "--chdir", folder, "--time=10", "--output=job.log", JOB, "sweep", "plan.yaml", "table.h5")


def log(folder):
    try:
        with open(os.path.join(folder, "job.log"), encoding="utf-8") as f:
            return f.read()
    except OSError:
        return ""


def texts(folder):
    """Logs of an array's tasks."""
    return "".join(open(os.path.join(folder, name), encoding="utf-8").read() for name in os.listdir(folder) if name.endswith(".log"))


def in_the_queue(folder):
    job = submit(folder)
    check(job.isdigit(), f"the sweep is submitted as job {job}")
    check(wait_for(lambda: journal(folder) > 8 * RECORD), f"cases are finished {log(folder)}")
    slurm("scancel", "--batch", "--signal=USR1", job)  # what Slurm does before the limit
    check(wait_for(lambda: "back into the queue" in log(folder)), f"at the signal the job goes back into the queue {log(folder)}")
    check("--resume table.h5" in log(folder), "and the program says how to go on")
    check(wait_for(lambda: state(job) == "PENDING"), f"the job is pending: {state(job)}")
    before = journal(folder)
    time.sleep(CREDENTIAL)
    slurm("scontrol", "update", f"jobid={job}", "StartTime=now")  # Slurm itself waits two minutes
    check(wait_for(lambda: journal(folder) > before + 6 * RECORD), f"it goes on {log(folder)}")
    slurm("scancel", "--signal=KILL", f"{job}.0")
    check(wait_for(lambda: state(job) in ("FAILED", "COMPLETED", "CANCELLED")), f"killed ranks end the job: {state(job)} {log(folder)}")
    check(state(job) == "FAILED", "as a failure")
    job = submit(folder)
    check(wait_for(lambda: state(job) in ("FAILED", "COMPLETED", "CANCELLED")) and state(job) == "COMPLETED",
          f"submitted again it is completed: {state(job)} {log(folder)}")
    check("\r" not in log(folder), "no progress bar in the log")


def ended(*jobs):
    return all(state(job) in ("FAILED", "COMPLETED", "CANCELLED", "TIMEOUT") for job in jobs)


def array(top, whole):
    folder = prepare_model(os.path.join(top, "array"), **LONG)
    for name in ("one", "two"):
        os.link(os.path.join(folder, "model.yaml"), os.path.join(folder, f"{name}.yaml"))
    with open(os.path.join(folder, "list.txt"), "w", encoding="utf-8") as f:
        f.write("one.yaml\ntwo.yaml\n")
    job = slurm("sbatch", "--parsable", "--chdir", folder, "--time=10", "--output=%a.log", "--array=1-2",
                os.path.join(CLUSTER, "array.sh"), "list.txt")
    tasks = (f"{job}_1", f"{job}_2")
    check(wait_for(lambda: ended(*tasks)) and all(state(t) == "COMPLETED" for t in tasks), f"an array of two is completed: {[state(t) for t in tasks]} {texts(folder)}")
    for name in ("one", "two"):
        same(os.path.join(folder, f"{name}.h5"), whole, f"model {name} of the array", but=("/@command",))


def chain(top, whole):
    folder = prepare_model(os.path.join(top, "chain"), **LONG)
    words = ("env", f"--chdir={folder}", "SBATCH_TIMELIMIT=10", "SBATCH_OUTPUT=link-%j.log", os.path.join(CLUSTER, "chain.sh"), "2",
             "evolve", "model.yaml", "chained.h5")
    jobs = [line.split()[-1] for line in slurm(*words).splitlines()]
    check(len(jobs) == 2 and wait_for(lambda: state(jobs[0]) == "RUNNING" and os.path.exists(os.path.join(folder, "chained.h5.part"))),
          f"a chain of two: {jobs}")
    slurm("scancel", "--signal=USR1", jobs[0])
    check(wait_for(lambda: ended(jobs[0])) and len(checkpoints(folder)) >= 1, "the first link ends with a checkpoint")
    check(wait_for(lambda: ended(jobs[1])) and state(jobs[1]) == "COMPLETED", f"the second goes on and completes: {state(jobs[1])}")
    with open(os.path.join(folder, f"link-{jobs[0]}.log"), encoding="utf-8") as f:
        said = f.read()
    check("go on     'ebbturn evolve --resume chained.h5'" in said and "\r" not in said, f"the log of the first says how to go on {said}")
    same(os.path.join(folder, "chained.h5"), whole, "after a chain of two", but=("/@command", "/@ranks"))


def end_time(top, whole, seconds):
    """seconds: what the whole run takes"""
    for part in (0.6, 0.3, 0.0):  # how fast a busy machine is changes from run to run
        folder = prepare_model(os.path.join(top, f"end{part}"), **LONG)
        until = int(time.time() + part * seconds) + 1
        code, _, err = end(start(folder, "model.yaml", ranks=2, env=dict(os.environ, SLURM_JOB_END_TIME=str(until))))
        if code:
            break
    late = time.time() - until
    check(code == 75 and late < 20.0 and "time limit" in err, f"a run ends near $SLURM_JOB_END_TIME: {code}, {late:.1f} s after it {err[:200]}")
    code, _, err = end(start(folder, "--resume", "out.h5", ranks=2))
    check(code == 0, "and is completed without it")
    same(os.path.join(folder, "out.h5"), whole, "after $SLURM_JOB_END_TIME", but=("/@command",))


def long_runs(top):
    wholes = []
    for ranks in (0, 2):  # the array's jobs have one rank, the links two
        folder = prepare_model(os.path.join(top, f"long{ranks}"), **LONG)
        begin = time.monotonic()
        code, _, err = end(start(folder, "model.yaml", ranks=ranks))
        seconds = time.monotonic() - begin
        check(code == 0, f"an uninterrupted run {err[:200]}")
        wholes.append(os.path.join(folder, "out.h5"))
    array(top, wholes[0])
    chain(top, wholes[1])
    end_time(top, wholes[1], seconds)


def main():
    with tempfile.TemporaryDirectory(prefix="ebbslurm-", dir="/tmp") as top:
        os.chmod(top, 0o755)  # munge asks for it
        started = subprocess.run([LOCAL, "start", os.path.join(top, "s")], capture_output=True, text=True, timeout=60, check=False)
        try:
            if started.returncode:
                print(f"SKIP  Slurm does not run here: {started.stderr.strip()}")
                sys.exit(0)
            os.environ["SLURM_CONF"] = started.stdout.strip().split("=")[1]
            os.environ["EBBTURN"] = os.path.abspath(PROGRAM)
            os.environ["SCRIPTS"] = os.path.abspath(CLUSTER)  # jobs are not submitted from the top of the sources
            whole, folder = os.path.join(top, "whole"), os.path.join(top, "queue")
            prepare(whole)
            prepare(folder)
            subprocess.run([os.environ["EBBTURN"], "sweep", "plan.yaml"], cwd=whole, check=True, capture_output=True, timeout=200)
            in_the_queue(folder)
            long_runs(top)
            with h5py.File(os.path.join(whole, "table.h5")) as a, h5py.File(os.path.join(folder, "table.h5")) as b:
                same = [k for k in a["sweep"] if a["sweep"][k][()].tobytes() == b["sweep"][k][()].tobytes()]
                check(len(same) == len(a["sweep"]) == len(b["sweep"]), "the table is that of an uninterrupted sweep, bit for bit")
                attempts = b["provenance/case_attempts"][()]
                check(np.all(attempts >= 1) and attempts.sum() <= 30 + 4, f"no finished case ran again: {attempts.sum()} attempts")
        finally:
            subprocess.run([LOCAL, "stop", os.path.join(top, "s")], capture_output=True, timeout=60, check=False)
    finish()


main()

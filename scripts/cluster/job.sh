#!/bin/bash
# SPDX-License-Identifier: BSD-2-Clause
# One job that goes on by itself: five minutes before its limit it is signalled, writes a checkpoint, ends with 75 and is put
# back into the queue. Submit: sbatch scripts/cluster/job.sh evolve MODEL RESULT, or sweep PLAN RESULT.
#SBATCH --job-name=ebbturn
#SBATCH --ntasks=2
#SBATCH --time=04:00:00
#SBATCH --signal=B:USR1@300
#SBATCH --requeue
#SBATCH --open-mode=append
#SBATCH --output=%x-%j.log

set -u
if [ $# -ne 3 ]; then
  echo "usage: sbatch job.sh evolve MODEL RESULT | sweep PLAN RESULT" >&2
  exit 2
fi
command=$1 input=$2 result=$3
export OMP_NUM_THREADS=1 OPENBLAS_NUM_THREADS=1

# begun before: go on; otherwise from the start
shopt -s nullglob
left=("$result".checkpoint-[01] "$result".journal-*)
if [ ${#left[@]} -eq 0 ]; then
  words=("$command" "$input" -o "$result")
elif [ "$command" = evolve ]; then
  words=(evolve --resume "$result")
else
  words=(sweep "$input" --resume "$result")
fi

requeue=0
pid=
trap 'requeue=1; kill -USR1 "$pid" 2>/dev/null' USR1 # limit near: checkpoint, and come back
trap 'kill -USR1 "$pid" 2>/dev/null' TERM            # scancel: checkpoint, and stay away
# Another launcher: RUN='mpiexec'. srun hands signals to the ranks and leaves them time; most mpiexecs leave a second.
# A task that dies takes the step with it: the others would wait for it.
read -r -a launcher <<<"${RUN:-srun --mpi=pmix --kill-on-bad-exit=1}"
"${launcher[@]}" "${EBBTURN:-ebbturn}" "${words[@]}" &
pid=$!
wait "$pid"
code=$?
while kill -0 "$pid" 2>/dev/null; do # a signal ends wait early
  wait "$pid"
  code=$?
done
wait "$pid" 2>/dev/null
late=$?
[ "$late" = 127 ] || code=$late # the shell still knows the status of a child that is gone

# 75 alone is not enough: it also follows scancel
if [ "$code" = 75 ] && [ "$requeue" = 1 ]; then
  echo "job.sh: checkpoint written, back into the queue (restart ${SLURM_RESTART_COUNT:-0})"
  scontrol requeue "$SLURM_JOB_ID"
fi
exit "$code"

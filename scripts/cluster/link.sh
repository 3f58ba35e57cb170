#!/bin/bash
# SPDX-License-Identifier: BSD-2-Clause
# One link of chain.sh: ends with a checkpoint before the limit, that of $LIMIT or the job's own from $SLURM_JOB_END_TIME.
#SBATCH --job-name=ebbturn-link
#SBATCH --ntasks=2
#SBATCH --time=04:00:00
#SBATCH --open-mode=append
#SBATCH --output=%x-%j.log

set -u
command=$1 input=$2 result=$3
export OMP_NUM_THREADS=1 OPENBLAS_NUM_THREADS=1
shopt -s nullglob
left=("$result".checkpoint-[01] "$result".journal-*)
if [ ${#left[@]} -eq 0 ] && [ -e "$result" ]; then
  echo "link.sh: '$result' is complete"
  exit 0
elif [ ${#left[@]} -eq 0 ]; then
  words=("$command" "$input" -o "$result")
elif [ "$command" = evolve ]; then
  words=(evolve --resume "$result")
else
  words=(sweep "$input" --resume "$result")
fi
# a task that dies takes the step with it: the others would wait for it
read -r -a launcher <<<"${RUN:-srun --mpi=pmix --kill-on-bad-exit=1}"
limit=() # LIMIT='3h50m' sets it; otherwise Slurm's own, where it says so
[ -n "${LIMIT:-}${SLURM_JOB_END_TIME:-}" ] || LIMIT=3h50m
[ -z "${LIMIT:-}" ] || limit=(--time-limit "$LIMIT")
exec "${launcher[@]}" "${EBBTURN:-ebbturn}" "${words[@]}" "${limit[@]}"

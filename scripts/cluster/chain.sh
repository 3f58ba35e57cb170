#!/bin/bash
# SPDX-License-Identifier: BSD-2-Clause
# A chain of jobs, for queues that forbid requeueing: each begins when the one before has ended, goes on from its checkpoint
# and finds nothing to do once the run is complete. Usage: chain.sh LINKS evolve MODEL RESULT, or LINKS sweep PLAN RESULT.
set -eu
if [ $# -ne 4 ]; then
  echo "usage: chain.sh LINKS evolve MODEL RESULT | LINKS sweep PLAN RESULT" >&2
  exit 2
fi
links=$1
shift
folder=$(cd "$(dirname "$0")" && pwd)
before=
for link in $(seq "$links"); do
  job=$(sbatch --parsable --no-requeue ${before:+--dependency=afterany:$before} "$folder/link.sh" "$@")
  echo "chain.sh: link $link is job $job"
  before=$job
done

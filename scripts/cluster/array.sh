#!/bin/bash
# SPDX-License-Identifier: BSD-2-Clause
# One job for each model of a list, at most eight at a time. Submit: sbatch --array=1-$(wc -l < LIST)%8 array.sh LIST, with a
# model file in each line; results stand beside the models. Each is signalled and requeued like job.sh.
#SBATCH --job-name=ebbturn-array
#SBATCH --ntasks=1
#SBATCH --time=04:00:00
#SBATCH --signal=B:USR1@300
#SBATCH --requeue
#SBATCH --open-mode=append
#SBATCH --output=%x-%A_%a.log

set -u
list=${1:?"usage: sbatch --array=1-N%8 array.sh LIST"}
# Slurm runs a copy of this file: SCRIPTS names the folder of job.sh, by default that under the folder of submission
scripts=${SCRIPTS:-$SLURM_SUBMIT_DIR/scripts/cluster}
model=$(sed -n "${SLURM_ARRAY_TASK_ID}p" "$list")
if [ -z "$model" ]; then
  echo "array.sh: '$list' has no line $SLURM_ARRAY_TASK_ID" >&2
  exit 2
fi
# shellcheck source=scripts/cluster/job.sh
. "$scripts/job.sh" evolve "$model" "${model%.yaml}.h5"

#!/bin/bash
# SPDX-License-Identifier: BSD-2-Clause
# A private Slurm of one node, for tests: no root-owned configuration, no accounting, everything in one folder. Usage:
#   eval "$(local-slurm.sh start FOLDER)"    starts munged, slurmctld and slurmd, prints the SLURM_CONF to export
#   local-slurm.sh stop FOLDER               stops exactly those three, by their process numbers
# FOLDER must have a short path (a socket lies in it) and belong to the user. Exit 77: Slurm is not installed.
set -u
action=${1:?start or stop}
mkdir -p "${2:?folder}"
folder=$(cd "$2" && pwd)
export SLURM_CONF=$folder/slurm.conf

daemons() { # pid files of those that run
  local name
  for name in slurmd slurmctld munged; do
    [ -f "$folder/$name.pid" ] && kill -0 "$(cat "$folder/$name.pid")" 2>/dev/null && echo "$folder/$name.pid"
  done
}

start() { # nproc --all: plain nproc obeys OMP_NUM_THREADS
  local host port tool state=
  PATH=$PATH:/usr/sbin:/sbin
  for tool in munged slurmctld slurmd sbatch srun; do
    command -v "$tool" >/dev/null || { echo "local-slurm.sh: no $tool; on Debian: apt-get install slurm-wlm munge" >&2; exit 77; }
  done
  mkdir -p "$folder/state" "$folder/spool" "$folder/log"
  chmod 755 "$folder"
  host=$(hostname -s)
  port=$((20000 + $$ % 20000))
  (umask 077; dd if=/dev/urandom of="$folder/munge.key" bs=128 count=1 status=none)
  munged --key-file="$folder/munge.key" --socket="$folder/munge.sock" --pid-file="$folder/munged.pid" \
    --log-file="$folder/log/munged.log" --seed-file="$folder/munge.seed" || { echo "local-slurm.sh: munged failed" >&2; exit 1; }
  echo "CgroupAutomount=no" >"$folder/cgroup.conf"
  cat >"$SLURM_CONF" <<EOF
ClusterName=ebbturn
SlurmctldHost=$host(127.0.0.1)
SlurmUser=$(id -un)
SlurmdUser=$(id -un)
AuthType=auth/munge
AuthInfo=socket=$folder/munge.sock,cred_expire=3
CredType=cred/munge
SlurmctldPort=$port
SlurmdPort=$((port + 1))
SlurmctldPidFile=$folder/slurmctld.pid
SlurmdPidFile=$folder/slurmd.pid
StateSaveLocation=$folder/state
SlurmdSpoolDir=$folder/spool
SlurmctldLogFile=$folder/log/slurmctld.log
SlurmdLogFile=$folder/log/slurmd.log
ProctrackType=proctrack/linuxproc
TaskPlugin=task/none
MpiDefault=pmix
SelectType=select/cons_tres
SelectTypeParameters=CR_Core
JobAcctGatherType=jobacct_gather/none
AccountingStorageType=accounting_storage/none
SwitchType=switch/none
ReturnToService=2
JobRequeue=1
KillWait=10
MinJobAge=600
InactiveLimit=0
SchedulerType=sched/backfill
SchedulerParameters=sched_interval=1,bf_interval=1,sched_min_interval=100000,batch_sched_delay=0
NodeName=$host NodeAddr=127.0.0.1 CPUs=$(nproc --all) RealMemory=$(awk '/MemTotal/ {print int($2 / 1024 * 0.9)}' /proc/meminfo)
PartitionName=main Nodes=$host Default=YES MaxTime=INFINITE State=UP
EOF
  slurmctld -c -f "$SLURM_CONF" || { echo "local-slurm.sh: slurmctld failed" >&2; exit 1; }
  slurmd -c -f "$SLURM_CONF" || { echo "local-slurm.sh: slurmd failed" >&2; exit 1; }
  for _ in $(seq 100); do
    state=$(sinfo -h -o %T 2>/dev/null)
    [ "$state" = idle ] && break
    sleep 0.1
  done
  if [ "$state" != idle ]; then
    echo "local-slurm.sh: the node is '$state'" >&2
    tail -n 5 "$folder"/log/*.log >&2
    exit 1
  fi
  echo "export SLURM_CONF=$SLURM_CONF"
}

stop() {
  local file
  if daemons | grep -q slurmctld; then # without it scancel would wait for minutes
    scancel --quiet --user="$(id -un)" 2>/dev/null
    for _ in $(seq 50); do
      [ -z "$(squeue -h 2>/dev/null)" ] && break
      sleep 0.1
    done
  fi
  for file in $(daemons); do kill "$(cat "$file")" 2>/dev/null; done
  for _ in $(seq 50); do
    [ -z "$(daemons)" ] && break
    sleep 0.1
  done
}

case $action in
start) start ;;
stop) stop ;;
*) echo "usage: local-slurm.sh start|stop FOLDER" >&2; exit 2 ;;
esac

#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# A cluster of two virtual nodes on this machine, for tests: daemons of one user on the loopback
# interface, everything they write below DIR. It proves submission, status, retry and collection;
# it proves nothing on speed, networks or the loss of real nodes.
#   slurm_start.sh DIR      then: export SLURM_CONF=DIR/slurm.conf; slurm_stop.sh DIR ends it
# Exit status 77 where there is no Slurm or it does not start, with the reason.
set -uo pipefail
dir=$1
PATH=$PATH:/usr/sbin:/sbin
skip() { echo "no cluster: $*"; exit 77; }
for command in munged mungekey slurmctld slurmd sbatch squeue sinfo; do
    command -v $command >/dev/null || skip "$command is not installed"
done
mkdir -p "$dir"/{state,spool/n1,spool/n2,log,run,munge} || skip "cannot write $dir"
chmod 755 "$dir" "$dir/run" # everybody may reach the socket
chmod 700 "$dir/munge"
user=$(id -un)
host=$(hostname -s)
read -r port port1 port2 < <(python3 - <<'P'
import socket
taken = [socket.create_server(("127.0.0.1", 0)) for _ in range(3)]
print(*(s.getsockname()[1] for s in taken))
P
)
cat >"$dir/slurm.conf" <<C
ClusterName=test
SlurmctldHost=$host(127.0.0.1)
SlurmUser=$user
SlurmdUser=$user
AuthType=auth/munge
AuthInfo=socket=$dir/run/munge.socket
CredType=cred/munge
SlurmctldPort=$port
SlurmctldPidFile=$dir/run/slurmctld.pid
SlurmdPidFile=$dir/run/slurmd.%n.pid
StateSaveLocation=$dir/state
SlurmdSpoolDir=$dir/spool/%n
SlurmctldLogFile=$dir/log/slurmctld.log
SlurmdLogFile=$dir/log/slurmd.%n.log
ProctrackType=proctrack/linuxproc
TaskPlugin=task/none
SelectType=select/cons_tres
SelectTypeParameters=CR_Core
SchedulerType=sched/backfill
SchedulerParameters=batch_sched_delay=0,sched_interval=1,sched_min_interval=0
CommunicationParameters=NoCtldInAddrAny,NoInAddrAny
AccountingStorageType=accounting_storage/none
JobAcctGatherType=jobacct_gather/none
JobCompType=jobcomp/none
MpiDefault=none
SwitchType=switch/none
ReturnToService=2
MinJobAge=3600
KillWait=5
MaxArraySize=11
NodeName=n1 NodeHostname=$host NodeAddr=127.0.0.1 Port=$port1 CPUs=1 RealMemory=1000 State=UNKNOWN
NodeName=n2 NodeHostname=$host NodeAddr=127.0.0.1 Port=$port2 CPUs=1 RealMemory=1000 State=UNKNOWN
PartitionName=main Nodes=n1,n2 Default=YES MaxTime=INFINITE State=UP
C
export SLURM_CONF=$dir/slurm.conf
mungekey --create --keyfile="$dir/munge/munge.key" || skip "no key for munged"
munged --key-file="$dir/munge/munge.key" --socket="$dir/run/munge.socket" \
    --pid-file="$dir/run/munged.pid" --log-file="$dir/log/munged.log" \
    --seed-file="$dir/munge/seed" || skip "munged: $(tail -n 1 "$dir/log/munged.log" 2>/dev/null)"
slurmctld -c || skip "slurmctld: $(tail -n 1 "$dir/log/slurmctld.log" 2>/dev/null)"
slurmd -N n1 && slurmd -N n2 || skip "slurmd: $(tail -n 1 "$dir"/log/slurmd.*.log 2>/dev/null)"
for _ in $(seq 200); do
    [ "$(sinfo --noheader --Node --format=%T 2>/dev/null | grep -c idle)" = 2 ] && exit 0
    sleep 0.1
done
skip "the nodes do not come up: $(sinfo --Node 2>&1 | tail -n 2)"

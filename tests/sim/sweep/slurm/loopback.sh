#!/usr/bin/env bash
# A private, throw-away Slurm of several nodes on 127.0.0.1, for tests: real daemons, no systemd, no cgroups, no accounting.
#
#   loopback.sh start     write configuration and key, start munged, slurmctld and the nodes' slurmd; wait until they are idle
#   loopback.sh status    nodes, queue, processes
#   loopback.sh stop      cancel jobs, end every daemon (by recorded PID and start time), remove the folder
#
# Environment: SLURM_LB_DIR    private folder [/tmp/slurm_lb.UID]; short, for a socket's name has under 108 characters
#              SLURM_LB_NODES  nodes [2];  SLURM_LB_CPUS  CPUs a node [2], may exceed the real ones
#              SLURM_LB_PORT   first of NODES + 1 ports [the first free run from 17817 on]
#              SLURM_LB_KEEP   1: keep the folder with its logs after stop
set -euo pipefail
export PATH=$PATH:/usr/sbin:/sbin

DIR=${SLURM_LB_DIR:-/tmp/slurm_lb.$(id -u)}
NODES=${SLURM_LB_NODES:-2}
CPUS=${SLURM_LB_CPUS:-2}
PORT=${SLURM_LB_PORT:-}
export SLURM_CONF=$DIR/slurm.conf

say() { printf '%s\n' "loopback: $*" >&2; }
die() { say "$*"; exit 1; }

# start time (clock ticks since boot) of a live, non-zombie PID; with the PID it names one process for good
born() { awk '{sub(/^.*\) /, ""); if ($1 != "Z") print $20}' "/proc/$1/stat" 2>/dev/null || true; }
alive() { [[ -n $2 && "$(born "$1")" == "$2" ]]; }

spawn() { # spawn TAG cmd... : start in its own session, detached from stdin/out, record "PID start-time"
  local tag=$1; shift
  setsid "$@" </dev/null >"$DIR/log/$tag.out" 2>&1 &
  echo "$! $(born $!)" >"$DIR/run/$tag.pid"
}

end() { # end TAG: TERM, then KILL, the recorded process
  local f=$DIR/run/$1.pid pid t i
  [[ -r $f ]] || return 0
  read -r pid t <"$f"
  if alive "$pid" "$t"; then
    kill -TERM "$pid" 2>/dev/null || true
    for ((i = 0; i < 100; i++)); do alive "$pid" "$t" || break; sleep 0.05; done
    if alive "$pid" "$t"; then say "$1 ($pid) ignored TERM, sending KILL"; kill -KILL "$pid" 2>/dev/null || true; fi
  fi
  rm -f "$f"
}

up() { # up TAG: die at once if that daemon is already gone
  local pid t
  read -r pid t <"$DIR/run/$1.pid"
  alive "$pid" "$t" || die "$1 ended at start-up, see $DIR/log/$1.out"
}

leftovers() { # PIDs of THIS cluster's slurmstepd (they survive their slurmd) and job processes, told by their environment
  local p e
  for p in /proc/[0-9]*; do
    e=$(tr '\0' '\n' 2>/dev/null <"$p/environ") || continue
    grep -qxF "SLURM_CONF=$SLURM_CONF" <<<"$e" || continue
    if [[ "$(cat "$p/comm" 2>/dev/null)" == slurmstepd* ]] || grep -q '^SLURM_JOB_ID=' <<<"$e"; then echo "${p#/proc/}"; fi
  done
}

failed() { # start went wrong: show why, leave nothing running, keep the logs
  local rc=$1
  ((rc)) || return 0
  tail -n 5 "$DIR"/log/*.out >&2 || true
  SLURM_LB_KEEP=1 cmd_stop
  exit "$rc"
}

pick_port() { # first run of NODES+1 ports on which nothing listens
  local i busy
  [[ -z $PORT ]] || return 0
  for ((PORT = 17817; PORT < 32000; PORT += NODES + 1)); do
    busy=0
    for ((i = 0; i <= NODES; i++)); do (: <>"/dev/tcp/127.0.0.1/$((PORT + i))") 2>/dev/null && busy=1 && break; done
    ((busy)) || return 0
  done
  die "no free ports"
}

write_conf() {
  local host i
  host=$(hostname -s)
  cat >"$DIR/slurm.conf" <<CONF
ClusterName=loopback
# name must be this host's short name, or slurmctld refuses: "this host not a valid controller"
SlurmctldHost=$host(127.0.0.1)
SlurmctldPort=$PORT
SlurmUser=$(id -un)
SlurmdUser=$(id -un)
# bind to the address the host name resolves to (127.0.0.1) rather than 0.0.0.0
CommunicationParameters=NoInAddrAny,NoCtldInAddrAny
AuthType=auth/munge
CredType=cred/munge
# cred_expire is also how long a requeued job must wait (default 120 s; 5 is the least accepted)
AuthInfo=socket=$DIR/run/munge.sock,cred_expire=5
StateSaveLocation=$DIR/state
SlurmdSpoolDir=$DIR/spool/%n
SlurmctldPidFile=$DIR/run/slurmctld.daemonpid
SlurmdPidFile=$DIR/run/%n.daemonpid
SlurmctldLogFile=$DIR/log/slurmctld.log
SlurmdLogFile=$DIR/log/%n.log
PlugStackConfig=$DIR/plugstack.conf
MailProg=/bin/true
ProctrackType=proctrack/linuxproc
TaskPlugin=task/none
JobAcctGatherType=jobacct_gather/none
SwitchType=switch/none
MpiDefault=none
AccountingStorageType=accounting_storage/none
# one text line per finished job: the poor man's sacct
JobCompType=jobcomp/filetxt
JobCompLoc=$DIR/log/jobcomp.txt
SchedulerType=sched/backfill
SchedulerParameters=sched_interval=1,sched_min_interval=0,bf_interval=1,batch_sched_delay=0
PriorityType=priority/basic
SelectType=select/cons_tres
SelectTypeParameters=CR_CPU
JobRequeue=1
MaxArraySize=10001
MaxJobCount=20000
MinJobAge=600
KillWait=1
SlurmctldTimeout=10
SlurmdTimeout=5
MessageTimeout=10
TCPTimeout=2
ReturnToService=2
PropagateResourceLimits=NONE
SlurmdParameters=config_overrides
CONF
  for ((i = 1; i <= NODES; i++)); do
    echo "NodeName=n$i NodeHostname=$host NodeAddr=127.0.0.1 Port=$((PORT + i)) CPUs=$CPUS RealMemory=1000 State=UNKNOWN" >>"$DIR/slurm.conf"
  done
  echo "PartitionName=main Nodes=ALL Default=YES MaxTime=INFINITE State=UP OverSubscribe=NO" >>"$DIR/slurm.conf"
}

cmd_start() {
  local i k n=0 p t
  if [[ -r $DIR/run/slurmctld.pid ]]; then
    read -r p t <"$DIR/run/slurmctld.pid"
    alive "$p" "${t:-}" && die "already running in $DIR (run stop first)"
    cmd_stop # left-overs of a run that was killed
  fi
  ((${#DIR} < 85)) || die "SLURM_LB_DIR too long for a unix socket"
  [[ "$(getent ahostsv4 "$(hostname)" | awk 'NR == 1 {print $1}')" == 127.* ]] ||
    die "host name must resolve to 127.x (the daemons bind there): echo '127.0.0.1 $(hostname)' >>/etc/hosts"
  pick_port
  rm -rf "$DIR"
  # 0711: munged insists that everyone can reach its socket
  mkdir -p "$DIR"; chmod 0711 "$DIR"
  mkdir -p "$DIR"/{run,log,state,spool}; chmod 0711 "$DIR/run"
  (umask 077; head -c 1024 /dev/urandom >"$DIR/munge.key")
  : >"$DIR/plugstack.conf"
  # slurmd 22.05 loads a cgroup plugin even when nothing uses it, and the default (autodetect) ends it where
  # /sys/fs/cgroup is not mounted (chroot, container); v1 named outright needs no mount. "disabled" is 23.02+.
  echo 'CgroupPlugin=cgroup/v1' >"$DIR/cgroup.conf"
  write_conf
  trap 'failed $?' EXIT

  spawn munged munged --foreground --key-file="$DIR/munge.key" --socket="$DIR/run/munge.sock" \
    --pid-file="$DIR/run/munged.daemonpid" --seed-file="$DIR/munge.seed" --log-file="$DIR/log/munged.log" --num-threads=2
  for ((i = 0; i < 100; i++)); do [[ -S $DIR/run/munge.sock ]] && munge -n -S "$DIR/run/munge.sock" >/dev/null 2>&1 && break; sleep 0.05; done
  munge -n -S "$DIR/run/munge.sock" | unmunge -S "$DIR/run/munge.sock" >/dev/null || die "munged does not answer"

  spawn slurmctld slurmctld -D -c -f "$SLURM_CONF"
  for ((i = 0; i < 200; i++)); do
    up slurmctld
    timeout 5 scontrol ping 2>/dev/null | grep -q 'is UP' && break
    sleep 0.05
  done
  for ((i = 1; i <= NODES; i++)); do
    mkdir -p "$DIR/spool/n$i"
    spawn "n$i" slurmd -D -N "n$i" -f "$SLURM_CONF"
  done
  for ((i = 0; i < 300; i++)); do
    for ((k = 1; k <= NODES; k++)); do up "n$k"; done
    n=$(sinfo -h -N -o '%N %t' 2>/dev/null | grep -c ' idle$') || true
    [[ $n == "$NODES" ]] && break
    sleep 0.1
  done
  [[ $n == "$NODES" ]] || { sinfo -N -o '%N %T %E' >&2 || true; die "only $n of $NODES nodes came up"; }
  trap - EXIT
  say "$NODES nodes x $CPUS CPUs up in $DIR, ports $PORT-$((PORT + NODES))"
}

cmd_status() {
  sinfo -N -o '%N %T %c %E'; squeue -r
  local f; for f in "$DIR"/run/*.pid; do echo "$(basename "$f" .pid) $(cat "$f")"; done
}

cmd_stop() {
  local i p t f
  [[ -d $DIR ]] || return 0
  if [[ -f $DIR/run/slurmctld.pid ]]; then
    read -r p t <"$DIR/run/slurmctld.pid"
    if alive "$p" "$t"; then
      if [[ -n "$(timeout 5 squeue -h 2>/dev/null)" ]]; then
        timeout 10 scancel --state=PENDING -u "$(id -un)" 2>/dev/null || true
        timeout 10 scancel -u "$(id -un)" 2>/dev/null || true
        for ((i = 0; i < 50; i++)); do [[ -z "$(timeout 5 squeue -h 2>/dev/null)" ]] && break; sleep 0.1; done
      fi
    fi
  fi
  for f in "$DIR"/run/n*.pid; do [[ -e $f ]] && end "$(basename "$f" .pid)"; done
  for p in $(leftovers); do kill -KILL "$p" 2>/dev/null || true; done
  end slurmctld
  end munged
  [[ ${SLURM_LB_KEEP:-0} == 1 ]] || rm -rf "$DIR"
  say "stopped"
}

case ${1:-} in
  start | stop | status) "cmd_$1" ;;
  *) sed -n '2,13p' "$0" >&2; exit 2 ;;
esac

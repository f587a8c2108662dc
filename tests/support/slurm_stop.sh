#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# Ends the daemons that slurm_start.sh DIR has started, by the numbers that they wrote down.
dir=$1
ended() { [ ! -d "/proc/$1" ] || grep -q '^State:.*Z' "/proc/$1/status" 2>/dev/null; }
for file in "$dir"/run/slurmd.*.pid "$dir"/run/slurmctld.pid "$dir"/run/munged.pid; do
    pid=$(cat "$file" 2>/dev/null) || continue
    kill -TERM "$pid" 2>/dev/null || continue
    for _ in $(seq 80); do
        ended "$pid" && break
        sleep 0.1
    done
    ended "$pid" || kill -KILL "$pid" 2>/dev/null
done
exit 0

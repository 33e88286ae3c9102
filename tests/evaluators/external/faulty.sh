#!/bin/sh
# Everything a program outside can get wrong; the first argument chooses.
begin='{"format": "hovergap field reply", "format_version": 1, "status": "ok", "metrics": {'
case $1 in
right) printf '%s"cost": 7.5}}' "$begin" > reply.json ;;
hang) sleep 300 & echo $! > "$2"; echo "still going"; wait ;;
crash) echo "no licence server" >&2; exit 3 ;;
signal) kill -SEGV $$ ;;
silent) ;;
flaky) if [ -e "$2" ]; then printf '%s"cost": 7.5}}' "$begin" > reply.json; else : > "$2"; exit 1; fi ;;
refusing) printf '{"format": "hovergap field reply", "format_version": 1, "status": "failed", "reason": "no\\u0007convergence\\ud800"}' > reply.json ;;
garbage) printf 'torque = 5' > reply.json ;;
bytes) printf '\377\376' > reply.json ;;
huge) head -c 2000000 /dev/zero > reply.json ;;
deep) awk 'BEGIN { for (i = 0; i < 200000; i++) printf "["; }' > reply.json ;;
nested) printf '%s"cost": {"value": {"x": 1}}}}' "$begin" > reply.json ;;
nan) printf '%s"cost": NaN}}' "$begin" > reply.json ;;
infinite) printf '%s"cost": 1e999}}' "$begin" > reply.json ;;
negative) printf '%s"cost": -1}}' "$begin" > reply.json ;;
text) printf '%s"cost": "7.5"}}' "$begin" > reply.json ;;
digits) printf '%s"cost": ' "$begin" > reply.json; awk 'BEGIN { for (i = 0; i < 9000; i++) printf "9"; }' >> reply.json; printf '}}' >> reply.json ;;
missing) printf '%s}}' "$begin" > reply.json ;;
unknown) printf '%s"cost": 1, "price\\u001b[31m": 1}}' "$begin" > reply.json ;;
twice) printf '%s"cost": 1, "cost": 2}}' "$begin" > reply.json ;;
version) printf '{"format": "hovergap field reply", "format_version": 2, "status": "ok", "metrics": {"cost": 1}}' > reply.json ;;
pipe) mkfifo reply.json ;;
link) ln -s /etc/passwd reply.json ;;
folder) mkdir reply.json ;;
flood) yes | head -c 100000000; sleep 300 ;;
counting) mkdir "$2/here" || { echo two at a time; exit 9; }; sleep 0.2; rmdir "$2/here"; printf '%s"cost": 7.5}}' "$begin" > reply.json ;;
esac

#!/usr/bin/env bash
# SPDX-License-Identifier: Apache-2.0
# The studies that ship are read whole, their plans say what they should, and both ends of the curve of
# examples/cd-loss-vs-bias lie in the right order, by more than their errors. A study with faults is
# refused before anything is written.
set -euo pipefail
rille=$1
root=$(cd "$(dirname "$0")/../.." && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
cd "$work"

fail() {
    echo "$*"
    exit 1
}
has() { grep -qF -- "$2" <<<"$1" || fail "not there: $2 in: $1"; }

bias=$root/examples/cd-loss-vs-bias
plan=$("$rille" study "$bias/study.yaml" --plan -o out)
has "$plan" "plan: full grid, 40 runs"
has "$plan" "pitch      follows cd by pitch.csv"
has "$plan" "constant: ion_flux of main stays 1.1 mA/cm2 while rf_bias.amplitude changes"
has "$plan" "estimate, from 3 of the points"
[ ! -e out ] || fail "--plan has written a folder"
plan=$("$rille" study "$root/examples/pressure-window/study.yaml" --plan)
has "$plan" "plan: full grid, 20 runs"
has "$plan" "ion_flux              follows pressure by plasma.csv"
if grep -q "^warning: pressure" <<<"$plan"; then fail "warned of a pressure whose plasma is linked"; fi

# As published beside the file, but the linked values are gone: that must warn.
cp -r "$root/examples/pressure-window" unlinked
sed -i '/^linked:/,/^answer:/{/^answer:/!d}' unlinked/study.yaml
plan=$("$rille" study unlinked/study.yaml --plan)
has "$plan" "warning: pressure of main varies while ion_flux and flux of Cl stay"

# Oracle: more bias sputters more of the sloped mask in the overetch of given length, so the line
# loses more. Source: common practice, no source. Tolerance: the sampling errors.
loss() {
    "$rille" run "$bias/case.yaml" -o "run_$1" --quiet --set plasmas.main.rf_bias.amplitude="$1 V"
    python3 -c "
import json
m = {x['name']: x for x in json.load(open('run_$1/metrics.json'))['metrics']}['top cd_loss']
print(m['value'], m['sampling_error'])"
}
low=$(loss 100) high=$(loss 450)
python3 -c "
low, low_error, high, high_error = map(float, '$low $high'.split())
assert low > 1, low
assert high - low > 0.5 and high - low > 5 * (low_error + high_error), (low, high)
" || fail "loss at 100 V: $low, at 450 V: $high"

printf 'format: 1\nbase: %s\nvary: {plasmas.main.rf_bais.amplitude: [1 V]}\n' "$bias/case.yaml" >bad.yaml
status=0
said=$("$rille" study bad.yaml -o bad 2>&1) || status=$?
[ $status = 3 ] || fail "status $status for a path that does not exist"
has "$said" 'bad.yaml:3:41: plasmas.main.rf_bais.amplitude: nothing is called "rf_bais" there; did you mean "rf_bias"?'
[ ! -e bad ] || fail "a refused study has written a folder"
"$rille" schema --study | python3 -c "
import json, sys
schema = json.load(sys.stdin)
assert 'vary' in schema['properties'] and schema['required'] == ['format', 'base'], schema['required']"
echo "both studies are read; the line loses $low nm at 100 V and $high nm at 450 V"

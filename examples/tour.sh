#!/usr/bin/env bash
# The whole job as a script: from an invented chip and a requirement to the setting sheet that an instrument PC pulls.
#
#   RINGBINDER_URL=http://127.0.0.1:8137 RINGBINDER_TOKEN=rbt_... examples/tour.sh [FOLDER]
#
# FOLDER gets the plot and the sheet (default: the current folder). Needs bash, curl, awk, and node to read JSON; a
# token of the role DESIGNER or ADMIN. May be run again: what exists already is used.
#
# Nothing here touches a driver. Infrared laser light is invisible and can injure eyes, too much current destroys
# heaters, and heated chips get hot: before a sheet is set on real hardware, the lab's laser safety officer, the local
# rules and the chip's data sheet have the last word.
set -euo pipefail

: "${RINGBINDER_URL:?address of the service, as in http://127.0.0.1:8137}"
: "${RINGBINDER_TOKEN:?a token of the role DESIGNER or ADMIN}"
lab=$(cd "$(dirname "${BASH_SOURCE[0]}")/lab" && pwd)
folder=${1:-.}
chip=HL-PR6-02
configuration=pump-trap
# Codes of cautions that somebody in this lab has read and takes, as in ["ROUNDING_LIMITS_NULL"]. A setting with one of its
# own that is not named here is not published, as it should be.
accepted='[]'
# Longest that the service is asked to hold one answer back, and how often it is asked.
wait_seconds=30
most_waits=20

work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT

# call METHOD PATH [CURL-OPTION...]: the body is in $work/body, the headers in $work/headers, the status in $status.
call() {
  local method=$1 path=$2
  shift 2
  status=$(curl -sS --max-time $((wait_seconds + 30)) -X "$method" -o "$work/body" -D "$work/headers" -w '%{http_code}' \
    -H "Authorization: Bearer $RINGBINDER_TOKEN" -H 'Content-Type: application/json' "$@" "$RINGBINDER_URL$path")
}

header() { tr -d '\r' <"$work/headers" | awk -v name="$1:" 'tolower($1) == name { sub(/^[^:]*: */, ""); print }'; }

# json EXPRESSION: of the last body, called `d`.
json() { node -pe "const d = JSON.parse(require('fs').readFileSync('$work/body', 'utf8')); $1"; }

fail() {
  printf '%s\n' "$1: status $status" >&2
  cat "$work/body" >&2
  exit 1
}

# expect WHAT STATUS...
expect() {
  local what=$1
  shift
  for one in "$@"; do [ "$status" = "$one" ] && return 0; done
  fail "$what"
}

# design FILE: asks, follows the request to its end, leaves the design in $work/body.
design() {
  call POST /v1/design-requests --data @"$1"
  expect 'asking for a design' 200 202
  local request state
  request=$(header location)
  for ((i = 0; i < most_waits; i++)); do
    call GET "$request"
    expect 'reading the request' 200
    state=$(json d.state)
    printf '  %s %s %%\n' "$state" "$(json 'Math.round(100 * d.progress)')"
    case $state in
      DONE)
        call GET "/v1/designs/$(json d.design)"
        expect 'reading the design' 200
        return
        ;;
      FAILED | CANCELLED) fail 'the request' ;;
    esac
    # Answered as soon as state or progress is another one than this tag names.
    call GET "$request" -H "If-None-Match: $(header etag)" -H "Prefer: wait=$wait_seconds"
    expect 'waiting for the request' 200 304
  done
  fail 'the request did not end in time'
}

echo "1. Register chip $chip (invented)"
call PUT "/v1/chips/$chip" -H 'If-None-Match: *' --data @"$lab/chip-pump-rejection.json"
expect 'registering' 201 412
[ "$status" = 201 ] && echo '  registered' || echo '  known already'

echo '2. A request that this chip cannot meet, and the nearest that it can'
cat >"$work/too-much.json" <<JSON
{ "chip": "$chip",
  "specification": { "family": {
    "family": "CHEBYSHEV_I", "shape": "LOW_PASS", "rippleDb": 1, "rejectionDb": 60,
    "band": { "offsetGhz": { "low": -10, "high": 10 } },
    "stopband": { "offsetGhz": { "low": 13, "high": 87 } } } } }
JSON
call POST /v1/design-requests --data @"$work/too-much.json"
expect 'asking for too much' 422
json '"  refused, " + d.code + ": " + d.detail'
json '"  nearest: " + d.nearest[0].reason'
json 'JSON.stringify(d.nearest[0].input)' >"$work/nearest.json"
design "$work/nearest.json"
json '"  " + d.reason'

echo '3. The requirement of the day: 60 dB at 193.4 THz, signal and idler within 1 dB'
design "$lab/request-pump-rejection.json"
cp "$work/body" "$work/design"
id=$(json d.id)
met=$(json d.compliance.met)
json '"  " + d.reason'
echo '  band      quantity             demand dB  reached dB  margin dB'
json 'd.compliance.bands.map(({ band, quantity, demand, reached, margin }) => "  " + (band.label ?? "").padEnd(9) + " " +
  quantity.padEnd(19) + [demand, reached, margin].map((x) => x.toFixed(2).padStart(11)).join("")).join("\n")'
echo '  channel  drives                  current mA  limit mA'
json 'd.setting.channels.map(({ channel, drives, currentMa, limitMa }) => "  " + channel.padEnd(8) + " " + drives.padEnd(22) +
  currentMa.toFixed(4).padStart(12) + limitMa.toFixed(2).padStart(10)).join("\n")'
json 'd.setting.cautions.map(({ code, text }) => "  CAUTION " + code + ": " + text).join("\n")'
[ "$met" = true ] || fail 'a band is missed: not published by this script'

echo '4. Plot'
call GET "/v1/designs/$id/plots/transmission.svg"
expect 'plotting' 200
cp "$work/body" "$folder/$chip-transmission.svg"
echo "  $folder/$chip-transmission.svg"

echo '5. Save it as a version, publish it'
call POST "/v1/chips/$chip/configurations/$configuration/versions" \
  --data "{ \"design\": \"$id\", \"note\": \"Invented example\" }"
expect 'saving the version' 201
version=$(json d.number)
echo "  $configuration version $version"
call PUT "/v1/chips/$chip/releases/current" \
  --data "{ \"configuration\": \"$configuration\", \"version\": $version, \"accept\": $accepted }"
expect 'publishing' 200 201
json '"  current is publication " + d.sequence'

echo '6. Pull it as the instrument PC does'
call GET "/v1/chips/$chip/releases/current.csv"
expect 'pulling' 200
tag=$(header etag)
# A sheet that is short or not for this chip, or a current above its limit, is not set. Columns are found by name.
tr -d '\r' <"$work/body" | awk -F, -v chip="$chip" '
  NR == 1 { for (i = 1; i <= NF; i++) column[$i] = i; next }
  { rows++; count = $column["channelCount"]; current = $column["currentMa"]; limit = $column["limitMa"] }
  $column["sheet"] != 1 || $column["chip"] != chip { bad = 1 }
  current !~ /^[0-9.]+$/ || limit !~ /^[0-9.]+$/ || current + 0 > limit + 0 { bad = 1 }
  END { if (bad || rows == 0 || rows != count) exit 1; print "  200, " rows " of " count " channels, none above its limit" }
' || fail 'the sheet is not to be set'
cp "$work/body" "$folder/$chip-setting.csv"
call GET "/v1/chips/$chip/releases/current.csv" -H "If-None-Match: $tag"
expect 'pulling again' 304
echo "  304, nothing new since $tag"

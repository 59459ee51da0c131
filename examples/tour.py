#!/usr/bin/env python3
"""The whole job as a Python script: from an invented chip and a requirement to the setting sheet of an instrument PC.

    RINGBINDER_URL=http://127.0.0.1:8137 RINGBINDER_TOKEN=rbt_... python3 examples/tour.py [FOLDER]

FOLDER gets the plot and the sheet (default: the current folder). Needs Python 3.8 or newer and nothing beside its
standard library; a token of the role DESIGNER or ADMIN. May be run again: what exists already is used.

Nothing here touches a driver. Infrared laser light is invisible and can injure eyes, too much current destroys heaters,
and heated chips get hot: before a sheet is set on real hardware, the lab's laser safety officer, the local rules and
the chip's data sheet have the last word.
"""

import csv
import io
import json
import os
import sys
import urllib.error
import urllib.request
from pathlib import Path

LAB = Path(__file__).resolve().parent / "lab"
CHIP = "HL-PR6-02"
CONFIGURATION = "pump-trap"

# Codes of cautions that somebody in this lab has read and takes, as in ["ROUNDING_LIMITS_NULL"]. A setting with one of
# its own that is not named here is not published, as it should be.
ACCEPTED = []

# Longest that the service is asked to hold one answer back, and how often it is asked.
WAIT_SECONDS = 30
MOST_WAITS = 20


class Problem(Exception):
    """What the service refused: the problem object (RFC 9457) it sent."""

    def __init__(self, problem):
        super().__init__("{title}: {detail}".format(**problem))
        self.problem = problem


class Ringbinder:
    """JSON over HTTP with a bearer token."""

    def __init__(self, url, token):
        self.url = url.rstrip("/")
        self.token = token

    def call(self, method, path, body=None, headers=None):
        """Answers (status, headers, bytes); 304 is an answer, 400 and above a Problem."""
        request = urllib.request.Request(self.url + path, method=method)
        request.add_header("Authorization", "Bearer " + self.token)
        for name, value in (headers or {}).items():
            request.add_header(name, value)
        if body is not None:
            request.add_header("Content-Type", "application/json")
            request.data = json.dumps(body).encode()
        try:
            with urllib.request.urlopen(request, timeout=WAIT_SECONDS + 30) as answer:
                return answer.status, answer.headers, answer.read()
        except urllib.error.HTTPError as error:
            with error:
                if error.code == 304:
                    return error.code, error.headers, b""
                text = error.read()
                if error.headers.get_content_type() == "application/problem+json":
                    raise Problem(json.loads(text)) from None
                raise

    def read(self, path):
        return json.loads(self.call("GET", path)[2])

    def design(self, ask):
        """Asks, follows the request to its end, answers the design."""
        _, headers, _ = self.call("POST", "/v1/design-requests", ask)
        path = headers["Location"]
        wait = {}
        for _ in range(MOST_WAITS):
            # Answered as soon as state or progress is another one than the tag names.
            status, headers, text = self.call("GET", path, headers=wait)
            wait = {"If-None-Match": headers["ETag"], "Prefer": "wait=%d" % WAIT_SECONDS}
            if status == 304:
                continue
            request = json.loads(text)
            print("  %s %.0f %%" % (request["state"], 100 * request["progress"]))
            if request["state"] == "DONE":
                return self.read("/v1/designs/" + request["design"])
            if request["state"] == "FAILED":
                raise Problem(request["problem"])
            if request["state"] == "CANCELLED":
                raise SystemExit("the request was cancelled")
        raise SystemExit("the request did not end in time")


def register(service):
    chip = json.loads((LAB / "chip-pump-rejection.json").read_text(encoding="utf-8"))
    try:
        service.call("PUT", "/v1/chips/" + CHIP, chip, {"If-None-Match": "*"})
        print("  registered")
    except Problem as error:
        if error.problem["code"] != "PRECONDITION_FAILED":
            raise
        print("  known already")


def ask_too_much(service):
    """A request that the chip cannot meet, and the nearest that it can."""
    ask = {
        "chip": CHIP,
        "specification": {
            "family": {
                "family": "CHEBYSHEV_I",
                "shape": "LOW_PASS",
                "rippleDb": 1,
                "rejectionDb": 60,
                "band": {"offsetGhz": {"low": -10, "high": 10}},
                "stopband": {"offsetGhz": {"low": 13, "high": 87}},
            }
        },
    }
    try:
        service.design(ask)
    except Problem as error:
        problem = error.problem
        print("  refused, %s: %s" % (problem["code"], problem["detail"]))
        if not problem["nearest"]:
            raise
        nearest = problem["nearest"][0]
        print("  nearest: " + nearest["reason"])
        return service.design(nearest["input"])
    raise SystemExit("six rings cannot do that: it should have been refused")


def print_design(design):
    print("  " + design["reason"])
    print("  band      quantity             demand dB  reached dB  margin dB")
    for one in design["compliance"]["bands"]:
        numbers = "".join("%11.2f" % one[name] for name in ("demand", "reached", "margin"))
        print("  %-9s %-19s%s" % (one["band"]["label"] or "", one["quantity"], numbers))
    print("  channel  drives                  current mA  limit mA")
    for one in design["setting"]["channels"]:
        print("  %-8s %-22s%12.4f%10.2f" % (one["channel"], one["drives"], one["currentMa"], one["limitMa"]))
    for caution in design["setting"]["cautions"]:
        print("  CAUTION %s: %s" % (caution["code"], caution["text"]))


def save_and_publish(service, design):
    path = "/v1/chips/%s" % CHIP
    ask = {"design": design["id"], "note": "Invented example"}
    version = json.loads(service.call("POST", "%s/configurations/%s/versions" % (path, CONFIGURATION), ask)[2])
    print("  %s version %d" % (CONFIGURATION, version["number"]))
    ask = {"configuration": CONFIGURATION, "version": version["number"], "accept": ACCEPTED}
    release = json.loads(service.call("PUT", path + "/releases/current", ask)[2])
    print("  current is publication %d" % release["sequence"])


def pull(service, folder):
    """As the instrument PC does. A sheet that is short or not for this chip, or a current above its limit, is not set."""
    path = "/v1/chips/%s/releases/current.csv" % CHIP
    status, headers, text = service.call("GET", path)
    rows = list(csv.DictReader(io.StringIO(text.decode(), newline="")))
    if not rows or any((row["sheet"], row["chip"], int(row["channelCount"])) != ("1", CHIP, len(rows)) for row in rows):
        raise SystemExit("the sheet is not whole, of another layout or for another chip")
    if not all(0 <= float(row["currentMa"]) <= float(row["limitMa"]) for row in rows):
        raise SystemExit("the sheet exceeds a limit")
    (folder / (CHIP + "-setting.csv")).write_bytes(text)
    print("  %d, %d channels, none above its limit" % (status, len(rows)))
    status, _, _ = service.call("GET", path, headers={"If-None-Match": headers["ETag"]})
    if status != 304:
        raise SystemExit("expected 304, got %d" % status)
    print("  304, nothing new since " + headers["ETag"])


def main():
    try:
        service = Ringbinder(os.environ["RINGBINDER_URL"], os.environ["RINGBINDER_TOKEN"])
    except KeyError as missing:
        raise SystemExit("set %s, see the head of this file" % missing.args[0]) from None
    folder = Path(sys.argv[1] if len(sys.argv) > 1 else ".")
    print("1. Register chip %s (invented)" % CHIP)
    register(service)
    print("2. A request that this chip cannot meet, and the nearest that it can")
    print("  " + ask_too_much(service)["reason"])
    print("3. The requirement of the day: 60 dB at 193.4 THz, signal and idler within 1 dB")
    design = service.design(json.loads((LAB / "request-pump-rejection.json").read_text(encoding="utf-8")))
    print_design(design)
    if not design["compliance"]["met"]:
        raise SystemExit("a band is missed: not published by this script")
    print("4. Plot")
    plot = folder / (CHIP + "-transmission.svg")
    plot.write_bytes(service.call("GET", "/v1/designs/%s/plots/transmission.svg" % design["id"])[2])
    print("  %s" % plot)
    print("5. Save it as a version, publish it")
    save_and_publish(service, design)
    print("6. Pull it as the instrument PC does")
    pull(service, folder)


if __name__ == "__main__":
    try:
        main()
    except Problem as refusal:
        sys.exit(str(refusal))

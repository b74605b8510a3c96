#!/usr/bin/env python3
"""A controller board written from sim/board/README.md alone, that misbehaves on request.

    board.py [--on stdio|unix:PATH|pty:FILE] [--fault KIND] [--at TICK] [--for TICKS] [--log FILE]

It turns a voltage vector by the speed reference (volts per hertz with a boost), knows nothing of the machine, and gives the reference as its
speed estimate. `pty:FILE` opens a pseudo-terminal and writes its name to FILE. KIND, from TICK on, for TICKS ticks:
silent (says no hello), version (speaks version 2), die, hang, late (0.15 s), twice, damaged, cut (last byte missing), duty (out of
range), fault (gates open, code 7), open (gates open without a fault), restart (forgets all, says hello unasked), wrong_tick, period (50 us).
"""
import argparse
import math
import os
import signal
import socket
import struct
import sys
import time
import tty

HELLO, ASK, SAMPLE, ANSWER, END = 1, 2, 3, 4, 5
COUNTS = 10000


def crc16(data):
    crc = 0xFFFF
    for byte in data:
        crc ^= byte << 8
        for _ in range(8):
            crc = (crc << 1 ^ 0x1021) & 0xFFFF if crc & 0x8000 else crc << 1
    return crc


TABLE = []
for byte in range(256):
    value = byte << 8
    for _ in range(8):
        value = (value << 1 ^ 0x1021) & 0xFFFF if value & 0x8000 else value << 1
    TABLE.append(value)


def quick_crc16(data):
    crc = 0xFFFF
    for byte in data:
        crc = (crc << 8 & 0xFFFF) ^ TABLE[crc >> 8 ^ byte]
    return crc


def stuff(data):
    out = bytearray()
    blocks = data.split(b"\0")
    for i, block in enumerate(blocks):
        while len(block) >= 254:
            out += b"\xff" + block[:254]
            block = block[254:]
            if not block and i + 1 == len(blocks):
                return bytes(out)
        out += bytes([len(block) + 1]) + block
    return bytes(out)


def unstuff(coded):
    out, at = bytearray(), 0
    while at < len(coded):
        code = coded[at]
        if code == 0 or at + code > len(coded):
            return None
        out += coded[at + 1:at + code]
        at += code
        if code != 255 and at < len(coded):
            out.append(0)
    return bytes(out)


def frame(payload):
    return b"\0" + stuff(payload + struct.pack("<HH", quick_crc16(payload), quick_crc16(payload[::-1]))) + b"\0"


def opened(coded):
    """The payload without its checks; None for a frame that is none."""
    whole = unstuff(coded)
    if whole is None or len(whole) < 5:
        return None
    payload = whole[:-4]
    return payload if struct.unpack("<HH", whole[-4:]) == (quick_crc16(payload), quick_crc16(payload[::-1])) else None


class Board:
    def __init__(self, options, read, write):
        self.o, self.read, self.write = options, read, write
        self.begin()

    def begin(self):
        self.angle, self.asked, self.last = 0.0, False, (None, b"")

    def hello(self, session):
        version = 2 if self.o.fault == "version" else 1
        period = 50000 if self.o.fault == "period" else 100000
        self.write(frame(struct.pack("<BHHIBBBBBHIIff32s", HELLO, version, session, period, 3, 12, 12, 1, 2, COUNTS, 0, 0, 30.0, 800.0,
                                     b"board.py")))

    def faulty(self, tick):
        return self.o.at <= tick < self.o.at + self.o.ticks

    def control(self, dc_link, reference):
        self.angle = math.remainder(self.angle + 2 * reference * 100e-6, 2 * math.pi)  # two pole pairs
        volts = min(25.0 + 2 * abs(reference) * 326.6 / 314.2, 320.0)
        duty = [0.5 + volts / max(dc_link, 100.0) * math.cos(self.angle - k * 2 * math.pi / 3) for k in range(3)]
        return [min(max(round(d * COUNTS), 0), COUNTS) for d in duty]

    def sample(self, payload):
        if len(payload) != 28 or not self.asked:
            return
        begun = time.perf_counter_ns()
        _, sequence, tick, gates, a, b, c, dc, edges, speed, torque = struct.unpack("<BHIBhhhhIff", payload)
        if self.o.log:
            self.o.log.write(f"{tick} {sequence} {gates} {a} {b} {c} {dc} {edges} {speed!r} {torque!r}\n")
            self.o.log.flush()
        if self.last[0] == (sequence, tick):
            self.write(self.last[1])
            return
        kind = self.o.fault if self.faulty(tick) else ""
        if kind == "die":
            os.kill(os.getpid(), signal.SIGKILL)
        if kind == "hang":
            while True:
                time.sleep(3600)
        if kind == "late" and tick == self.o.at:
            time.sleep(0.15)
        if kind == "restart" and tick == self.o.at:
            self.begin()
            self.hello(0)
            return
        duty = self.control(dc * 800.0 / 2048, speed)
        if kind == "duty":
            duty[1] = COUNTS + 1
        if kind == "wrong_tick":
            tick += 1
        out = frame(struct.pack("<BHIBB3H4fI", ANSWER, sequence, tick, kind not in ("fault", "open"), 7 if kind == "fault" else 0, *duty, speed,
                                math.nan, math.nan, math.nan, time.perf_counter_ns() - begun))
        self.last = ((sequence, tick), out)
        if kind == "damaged":
            out = bytearray(out)
            out[20] ^= 0x55 if out[20] != 0x55 else 0x54
        if kind == "cut":
            out = out[:-2] + out[-1:]
        self.write(bytes(out) * (2 if kind == "twice" else 1))

    def run(self):
        silent = self.o.fault == "silent"
        if not silent:
            self.hello(0)
        coded = bytearray()
        while data := self.read():
            for byte in data:
                if byte:
                    coded.append(byte)
                    continue
                payload = opened(bytes(coded)) if coded else None
                coded.clear()
                if payload is None or silent:
                    continue
                if payload[0] == ASK:
                    self.begin()
                    self.asked = True
                    self.hello(struct.unpack_from("<HH", payload, 1)[1])
                elif payload[0] == SAMPLE:
                    self.sample(payload)
                elif payload[0] == END:
                    self.begin()


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("--on", default="stdio")
    parser.add_argument("--fault", default="")
    parser.add_argument("--at", type=int, default=0)
    parser.add_argument("--for", dest="ticks", type=int, default=1 << 40)
    parser.add_argument("--log", type=argparse.FileType("w"))
    options = parser.parse_args()
    assert crc16(b"123456789") == quick_crc16(b"123456789") == 0x29B1
    kind, _, place = options.on.partition(":")
    if kind == "unix":
        listener = socket.socket(socket.AF_UNIX)
        listener.bind(place)
        listener.listen(1)
        line, _ = listener.accept()
        read, write = (lambda: line.recv(4096)), line.sendall
    elif kind == "pty":
        ours, theirs = os.openpty()
        tty.setraw(theirs)
        with open(place + ".new", "w") as file:
            file.write(os.ttyname(theirs))
        os.rename(place + ".new", place)
        read, write = (lambda: os.read(ours, 4096)), (lambda data: os.write(ours, data))
    else:
        read, write = (lambda: os.read(0, 4096)), (lambda data: os.write(1, data))
    try:
        Board(options, read, write).run()
    except (BrokenPipeError, ConnectionResetError):
        sys.exit(0)


if __name__ == "__main__":
    main()

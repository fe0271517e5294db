"""Drives docs/recorders/recorder.py against a store in memory. drive.go and Drive.java do the same, step by step."""

import os
import sys
import threading

sys.path.insert(0, sys.argv[1])
from recorder import Recorder


class Refused(Exception):
    pass


def fails(error):
    raise error


def expect_error(what, kind, call):
    try:
        call()
    except kind:
        return
    sys.exit(f"{what}: expected an error")


path = sys.argv[2]
recorder = Recorder(path, title="drive", clock_error_ns=1000, refused_when=lambda error: isinstance(error, Refused))
store, lock, boarded = {}, threading.Lock(), [0]


def add(by):
    with lock:
        boarded[0] += by
        return boarded[0]


def drive(gate, key):
    for _ in range(25):
        value = recorder.unique_value("vessel")
        gate.write(key, value, lambda: store.__setitem__(key, value))
        gate.read(key, lambda: store.get(key))
        gate.increment("boarded", 2, lambda: add(2))


over = recorder.mark('node "4" stopped')
threads = [threading.Thread(target=drive, args=(recorder.client(f"gate-{i}"), f"berth/{i}")) for i in range(4)]
for thread in threads:
    thread.start()
for thread in threads:
    thread.join()
over()

desk = recorder.client("desk")
big, tricky = 18446744073709551615, '"\\\u0001\n\u00e9\U0001d11e'
desk.write("big", big, lambda: None)
desk.read("big", lambda: big)
desk.write("tricky", tricky, lambda: None)
desk.read("tricky", lambda: tricky)
desk.write("lease", "a", lambda: None, basis=None)
desk.cas("lease", "a", "b", lambda: {"applied": True})
desk.cas("lease", "a", "c", lambda: {"applied": False, "saw": "b"})
desk.delete("lease", lambda: None)
desk.read("lease", lambda: None)
desk.increment("waiting", -1, lambda: None)
expect_error("a refusal", Refused, lambda: desk.write("lease", "d", lambda: fails(Refused("no"))))
expect_error("a time-out", TimeoutError, lambda: desk.write("lease", "e", lambda: fails(TimeoutError("late"))))
expect_error("bytes", TypeError, lambda: desk.read("raw", lambda: b"bytes"))
expect_error("one name twice", ValueError, lambda: recorder.client("desk"))
expect_error("a file that exists", FileExistsError, lambda: Recorder(path))

recorder.mark("never over")
late, sent = recorder.client("late"), threading.Event()
stuck = lambda: late.write("late", "f", lambda: (sent.set(), threading.Event().wait()))
threading.Thread(target=stuck, daemon=True).start()
sent.wait()
expect_error("two at a time", RuntimeError, lambda: late.read("late", lambda: None))
os._exit(0)

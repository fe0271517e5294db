"""Records what the clients of a store ask of it, as a history that `misread check` reads. Python 3.8 or newer.

    recorder = Recorder("drill.ndjson", refused_when=lambda error: isinstance(error, ReplyError))
    gate = recorder.client("gate-1")  # one for each thread
    value = recorder.unique_value("vessel")
    gate.write("berth/2", value, lambda: store.set("berth/2", value))
    gate.read("berth/2", lambda: store.get("berth/2"))  # decode bytes: a value is JSON, None for absence

The opening half of each record is with the operating system before its request is sent: a kill loses no request.
Make the recorder after a fork, not before it: every process has a clock, a run and a file of its own.
"""

import json
import os
import secrets
import socket
import threading
import time

_ANCHOR = time.time_ns() - time.monotonic_ns()
_CLOCK = f"{socket.gethostname()}-{os.getpid()}-{secrets.token_hex(3)}"
_NOT_TOLD = object()


def _now():
    return _ANCHOR + time.monotonic_ns()


def _text(record):
    # Integers are written whole, whatever their size. NaN and what is not JSON (bytes, say) raise an error.
    return json.dumps(record, allow_nan=False, separators=(",", ":"))


def _whole(number):
    if isinstance(number, bool) or not isinstance(number, int):
        raise TypeError(f"found {number!r}, expected a whole number")
    return number


class Recorder:
    def __init__(self, path, title=None, clock_error_ns=0, refused_when=lambda error: False):
        """`refused_when`: True for errors that prove that nothing happened; all others are unsure."""
        self.run = f"{time.time_ns() // 10**6:x}{secrets.token_hex(3)}"
        self._refused_when = refused_when
        self._lock = threading.Lock()
        self._names, self._ids, self._values, self._failure = set(), 0, 0, None
        # Never writes over or behind another recording.
        self._file = os.open(path, os.O_WRONLY | os.O_CREAT | os.O_EXCL | os.O_APPEND, 0o666)
        header = {"history": 1, "clockError": clock_error_ns}
        self._write(header if title is None else {**header, "title": title})

    def client(self, name):
        """One sequential requester. Its name is made unique to this run."""
        with self._lock:
            if name in self._names:
                raise ValueError(f"the client {name!r} exists already: give each concurrent requester its own name")
            self._names.add(name)
        return Client(self, f"{name}@{self.run}")

    def unique_value(self, prefix="v"):
        """A value that no run ever repeats."""
        with self._lock:
            self._values += 1
            return f"{prefix}-{self.run}-{self._values}"

    def mark(self, text):
        """Something happened to the store. Call what it returns when that is over."""
        start = _now()
        self._write({"mark": text, "start": start})
        return lambda: self._write({"mark": text, "start": start, "end": _now()})

    def close(self):
        with self._lock:
            self._failure = self._failure or ValueError("this recorder is closed")
            os.fsync(self._file)
            os.close(self._file)
            self._file = -1

    def _next_id(self):
        with self._lock:
            self._ids += 1
            return f"{self.run}-{self._ids}"

    def _write(self, record):
        line = memoryview((_text(record) + "\n").encode("ascii"))
        with self._lock:
            if self._failure:  # nothing may follow a line that was lost
                raise self._failure
            try:
                while line:
                    line = line[os.write(self._file, line) :]
            except OSError as error:
                self._failure = error
                raise


class Client:
    def __init__(self, recorder, name):
        self.name = name
        self._recorder = recorder
        self._busy = threading.Lock()

    def read(self, key, request):
        return self._run("read", key, {}, request, lambda value: {"value": value})

    def write(self, key, value, request, basis=_NOT_TOLD):
        """`basis`: the value, read earlier, that this one was computed from."""
        more = {} if basis is _NOT_TOLD else {"basis": basis}
        return self._run("write", key, {"value": value, **more}, request, lambda _: {})

    def increment(self, key, by, request):
        """`request` returns the count after it, or None where the store does not say."""
        told = lambda count: {} if count is None else {"value": _whole(count)}
        return self._run("increment", key, {"by": _whole(by)}, request, told)

    def cas(self, key, expect, value, request):
        """`request` returns {"applied": True} or {"applied": False}, this with "saw" where the store says."""

        def told(answer):
            if not isinstance(answer["applied"], bool):
                raise TypeError(f"found {answer['applied']!r} as applied, expected True or False")
            if answer["applied"] or "saw" not in answer:
                return {"applied": answer["applied"]}
            return {"applied": False, "saw": answer["saw"]}

        return self._run("cas", key, {"expect": expect, "value": value}, request, told)

    def delete(self, key, request):
        return self._run("delete", key, {}, request, lambda _: {})

    def _run(self, op, key, fields, request, told):
        recorder = self._recorder
        if not self._busy.acquire(blocking=False):
            raise RuntimeError(f"the client {self.name!r} has a request in flight: one at a time a client")
        try:
            id = recorder._next_id()
            opening = {"id": id, "client": self.name, "host": _CLOCK, "op": op, "key": key, **fields}
            recorder._write({**opening, "start": _now()})
            try:
                answer = request()
            except BaseException as error:
                end, refused = _now(), False
                try:
                    refused = recorder._refused_when(error) is True
                finally:
                    recorder._write({"id": id, "end": end, "outcome": "refused" if refused else "unsure"})
                raise
            end = _now()
            try:
                closing = {"id": id, "end": end, **told(answer)}
                _text(closing)
            except BaseException:  # an answer that cannot be recorded is no answer to hold the store to
                recorder._write({"id": id, "end": end, "outcome": "unsure"})
                raise
            recorder._write(closing)
            return answer
        finally:
            self._busy.release()

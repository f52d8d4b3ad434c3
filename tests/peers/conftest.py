"""Starts the release build on a free port and asks it questions; what it answers is held against reference libraries.

Random input comes from one seed, printed at the end of the run; PEERS_SEED repeats a run.
"""

import os
import random
import re
import subprocess
from pathlib import Path

import numpy as np
import pytest
import requests

ROOT = Path(__file__).resolve().parents[2]
TARGET = Path(os.environ.get("CARGO_TARGET_DIR", ROOT / "target"))
BINARY = Path(os.environ.get("PEERS_BINARY", TARGET / "release" / "rainward"))
SEED = int(os.environ.get("PEERS_SEED") or random.SystemRandom().randrange(2**31))


def pytest_terminal_summary(terminalreporter):
    terminalreporter.write_line(f"PEERS_SEED={SEED}")


class Service:
    """The running service."""

    def __init__(self, url):
        self.url = url
        self.session = requests.Session()

    def get(self, path, query=None):
        return self.session.get(self.url + path, params=query, timeout=60)

    def ask(self, path, **query):
        """The answer to a question that must be answered well."""
        answer = self.get(path, query)
        assert answer.status_code == 200, f"{answer.url}: {answer.status_code} {answer.text}"
        return answer.json()


@pytest.fixture(scope="session")
def service(tmp_path_factory):
    log = tmp_path_factory.mktemp("service") / "log"
    environment = {name: value for name, value in os.environ.items() if not name.startswith("RAINWARD_")}
    environment |= {"RAINWARD_LISTEN": "127.0.0.1:0", "RAINWARD_LOG__LEVEL": "warn"}
    with open(log, "w") as errors:
        process = subprocess.Popen([BINARY], stdout=subprocess.PIPE, stderr=errors, text=True, env=environment)
    try:
        greeting = process.stdout.readline()
        address = re.search(r"http://127\.0\.0\.1:\d+", greeting)
        assert address, f"the service did not start: {greeting!r} {log.read_text()}"
        yield Service(address.group())
        assert process.poll() is None, f"the service died: {log.read_text()}"
    finally:
        process.terminate()
        process.wait(timeout=30)
    assert process.returncode == 0, f"no clean stop: {process.returncode} {log.read_text()}"
    faults = [line for line in log.read_text().splitlines() if "ERROR" in line]
    assert not faults, f"the service logged faults: {faults[:5]}"


@pytest.fixture
def rng(request):
    """Random numbers of a test's own, the same whichever tests run beside it."""
    return np.random.default_rng([SEED, *request.node.name.encode()])

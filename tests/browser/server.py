"""A Bankside server that can be killed and started again where it was."""

import os
import signal
import subprocess
import sys
from pathlib import Path

from tests.browser.conftest import _wait_for, free_port

ROOT = Path(__file__).resolve().parents[2]


class Server:
    """A server process on a data folder and a port that stay the same; code is the folder of its program."""

    def __init__(self, data_dir, code=ROOT):
        self.data_dir = data_dir
        self.code = code
        self.port = free_port()
        self.address = f"http://127.0.0.1:{self.port}"
        self.process = None

    def start(self, command="demo"):
        """Start and wait until it answers."""
        environ = {name: value for name, value in os.environ.items() if not name.startswith("BANKSIDE_")}
        arguments = [command, "--data", str(self.data_dir), "--host", "127.0.0.1", "--port", str(self.port)]
        program = [sys.executable, "-c", "from webapp.cli import main; main()", *arguments]
        self.process = subprocess.Popen(program, env=environ, cwd=self.code, stdout=subprocess.DEVNULL)
        _wait_for(self.address, self.process)

    def kill(self):
        """Kill it at once, as a power cut would."""
        if self.process is not None:
            self.process.kill()
            self.process.wait(10)

    def hang(self):
        """Let it take connections and answer nothing."""
        os.kill(self.process.pid, signal.SIGSTOP)

    def go_on(self):
        """Let it answer again."""
        os.kill(self.process.pid, signal.SIGCONT)

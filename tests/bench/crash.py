"""Kill the server many times while phones post. Run: python -m tests.bench.crash [kills]"""

import sys
import tempfile
from pathlib import Path

from tests.browser.server import Server
from tests.crashing import crash_loop


def main():
    """Print what happened."""
    kills = int(sys.argv[1]) if len(sys.argv) > 1 else 30
    with tempfile.TemporaryDirectory() as folder:
        server = Server(Path(folder) / "data")
        server.start()
        try:
            found = crash_loop(server, kills)
        finally:
            server.kill()
    print(f"{kills} kills")
    for name, value in found.items():
        print(f"{name}: {len(value) if isinstance(value, list) else value}")
    sys.exit(bool(found["lost"] or found["doubled"] or found["refused"]))


if __name__ == "__main__":
    main()

"""Makes `package.json`, the index by which MicroPython's own installer (mip) fetches the firmware's source files.

`python -m host.board.mip_index` writes it anew. It takes the files beside it; boot.py first, main.py last, as an
install does. Compiled files are not in it: they are made for a board when it is known.
"""

import json

from host.board.files import ROOT, sources

INDEX = "package.json"


def index_text() -> str:
    """The index: each file's place on the board, and where it is beside the index. Use it with the target '/'."""
    pairs = [(path, source.relative_to(ROOT).as_posix()) for path, source in sources()]
    order = {path: place for place, path in enumerate(("/boot.py", "", "/main.py"))}
    pairs.sort(key=lambda pair: (order.get(pair[0], 1), pair[0]))
    urls = [[path[1:], name] for path, name in pairs]
    rows = ",\n".join("  " + json.dumps(row) for row in urls)
    return f'{{\n "version": "{_version()}",\n "deps": [],\n "urls": [\n{rows}\n ]\n}}\n'


def _version() -> str:
    from shared_protocol.messages import FIRMWARE

    return FIRMWARE.decode()


if __name__ == "__main__":
    (ROOT / INDEX).write_text(index_text())

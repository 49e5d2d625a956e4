"""The command line: `sublevel serve`, `sublevel audit`, and every question of the API as a command of the same name.

A question is asked of the application in this process, through ASGI, so a terminal and a client get the same answer.
Only what a command needs is imported.
"""

import argparse
import os
import sys
from collections.abc import Sequence

from service.worker import FEW_THREADS


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command; returns the exit status."""
    for name in FEW_THREADS:  # blocks are tiny: more threads only cost, and change the last bits of sums
        os.environ.setdefault(name, "1")
    given = list(sys.argv[1:] if arguments is None else arguments)
    if given[:1] == ["serve"]:
        return serve(given[1:])
    if given[:1] == ["audit"]:
        from levels.audit import main as audit

        return audit(given[1:])
    from service.terminal import ask

    return ask(given)


def serve(given: Sequence[str]) -> int:
    """Start the server; options win over the environment."""
    import pydantic

    from service.settings import Settings

    parser = argparse.ArgumentParser(prog="sublevel serve", description="Start the server.")
    for name in ("host", "port", "workers"):
        parser.add_argument(f"--{name}", help=Settings.model_fields[name].description)
    chosen = {name: value for name, value in vars(parser.parse_args(given)).items() if value is not None}
    for name, value in chosen.items():
        os.environ[f"SUBLEVEL_{name.upper()}"] = value  # workers are processes of their own and read it there
    try:
        settings = Settings()
    except pydantic.ValidationError as error:
        for item in error.errors():
            print(f"sublevel serve: {'.'.join(map(str, item['loc']))}: {item['msg']}", file=sys.stderr)
        return 2
    from service.server import run

    return run(settings)


if __name__ == "__main__":
    raise SystemExit(main())

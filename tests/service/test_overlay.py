"""A laboratory's own values: laid over the book, told in every answer that used them, or the server does not start."""

import os
import subprocess
import sys
from pathlib import Path

import httpx2
import pytest

from service.cli import main
from tests.service.conftest import ROOT, free_port, start_server, stop_server

OURS = """\
[levels."5p_2P3/2".hyperfine.87]
A = { value = "84.7190(5) MHz", source = "logbook 12" }
[[lines.780.frequency]]
isotope = 87
value = "384230484.470(3) MHz"
"""
BAD = {
    "unknown key": ('[levels."5p_2P3/2".hyperfine.87]\nA_hfs = { value = "84.7 MHz" }\n', "A_hfs", "unknown key"),
    "wrong unit": ('[levels."5p_2P3/2".hyperfine.87]\nA = { value = "84.7 nm" }\n', "hyperfine.87.A", "unit"),
    "bad digits": ('[isotopes.87]\ng_I = { value = "-0.00099(" }\n', "isotopes.87.g_I", "digits"),
    "no such isotope": (
        '[levels."5p_2P3/2".hyperfine.88]\nA = { value = "84.7 MHz" }\n',
        "5p_2P3/2",
        "no isotope 88",
    ),
    "no such level": ('[lines.780]\nupper = "5p_2P5/2"\n', "lines.780", "no level"),
    "not TOML": ("[levels\n", "", "not TOML"),
}


def write(folder: Path, **files: str) -> Path:
    for name, text in files.items():
        (folder / f"{name}.toml").write_text(f'[element]\nsymbol = "Rb"\n\n{text}', encoding="utf-8")
    return folder


def test_every_answer_that_used_it_says_so(tmp_path: Path) -> None:
    """A server with an overlay answers from its values, names them as sources, and has a release of its own."""
    write(tmp_path, ourlab=OURS)
    process, server = start_server(SUBLEVEL_OVERLAY=str(tmp_path))
    try:
        with httpx2.Client(base_url=server.url) as client:
            release = client.get("/v1/release").json()
            assert release["overlaid"] == ["Rb"]
            assert ".overlay." in release["release"]
            levels = client.get("/v1/atoms/87Rb/levels").json()
            (upper,) = [level for level in levels["levels"] if level["name"] == "5p_2P3/2"]
            assert (upper["A"]["text"], upper["A"]["source"]) == ("84.7190(5) MHz", "overlay:ourlab:logbook 12")
            for path in (
                "/v1/atoms/87Rb/shift?line=780&lower=2,2&upper=3,3&field=3.2",
                "/v1/atoms/87Rb/components?line=780&field=3.2",
                "/v1/atoms/87Rb/sublevels?level=5p_2P3/2&field=3.2",
                "/v1/atoms/87Rb/strengths?line=780",
                "/v1/atoms/87Rb/lines",
                "/v1/lines?near=780.24&within=0.01",
            ):
                sources = [source["id"] for source in client.get(path).json()["sources"]]
                assert any(source.startswith("overlay:ourlab:") for source in sources), path
            frequency = client.get("/v1/lines?near=780.24&within=0.01").json()["columns"]["frequency_THz"][0]
            assert frequency == pytest.approx(384.230484470, abs=1e-12)
            untouched = client.get("/v1/atoms/133Cs/shift?line=852&lower=4,4&upper=5,5&field=1").json()
            assert not any(source["id"].startswith("overlay:") for source in untouched["sources"])
    finally:
        stop_server(process)


def test_the_start_prints_what_the_audit_finds(tmp_path: Path) -> None:
    """An overlay that holds but breaks a rule of physics is served, and the log says which rule and where."""
    write(tmp_path, ourlab='[levels."5s_2S1/2".hyperfine.87]\nA = { value = "3147.341305(1) MHz" }\n')
    process, _ = start_server(SUBLEVEL_OVERLAY=str(tmp_path))
    assert "Rb: levels.5s_2S1/2.A.85.87: A ratio" in stop_server(process).decode()


@pytest.mark.parametrize("kind", BAD)
def test_a_bad_overlay_stops_the_start(kind: str, tmp_path: Path) -> None:
    """The server does not start, though another file of the overlay is good; it prints file, key and reason."""
    text, key, reason = BAD[kind]
    write(tmp_path, a_good=OURS, b_bad=text)
    command = [sys.executable, "-m", "service.cli", "serve", "--port", str(free_port())]
    environment = {**os.environ, "SUBLEVEL_OVERLAY": str(tmp_path)}
    ended = subprocess.run(command, cwd=ROOT, env=environment, capture_output=True, text=True, timeout=60)
    assert ended.returncode == 2
    assert "b_bad.toml" in ended.stderr
    assert key in ended.stderr
    assert reason in ended.stderr


@pytest.mark.parametrize(
    ("text", "status", "said"),
    [
        (OURS, 0, ""),
        ('[levels."5s_2S1/2".hyperfine.87]\nA = { value = "3147.341305(1) MHz" }\n', 1, "A ratio"),
        ('[levels."5p_2P3/2"]\nlifetime = { value = "2.62(1) ns" }\n', 1, "width of the D2 line"),
        ('[levels."5p_2P3/2"]\nlifetime = { value = "26.2 nm" }\n', 2, "ourlab.toml"),
    ],
    ids=["good", "two digits swapped", "a lost digit", "wrong unit"],
)
def test_an_overlay_can_be_checked_before_a_restart(
    text: str, status: int, said: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """`sublevel audit folder` says whether an overlay holds (2 if not) and whether its physics does (1 if not)."""
    assert main(["audit", str(write(tmp_path, ourlab=text))]) == status
    printed = capsys.readouterr()
    assert said in printed.out + printed.err

"""Standard output and standard error, colour, poor streams, faults of our own, and a quick start."""

from __future__ import annotations

import io
import json
import os
import subprocess
import sys

import pytest

from vib.cli import run

COMMANDS = ["new", "check", "modes", "ring", "screen", "report", "schema"]


def process(*arguments, shell_end="", **environment):
    """Run in a process of its own."""
    line = " ".join([f'"{sys.executable}" -m vib', *(f'"{argument}"' for argument in arguments), shell_end])
    return subprocess.run(
        ["bash", "-c", f"set -o pipefail; {line}"],
        capture_output=True,
        env={**os.environ, **environment},
        timeout=120,
        check=False,
    )


@pytest.mark.parametrize("command", COMMANDS)
def test_the_help_of_each_command_has_an_example(vib, command):
    done = vib(command, "--help")
    assert done.status == 0
    assert f"Example:\n    vib {command}" in done.out


def test_help_lists_the_commands_in_the_order_of_work(vib):
    done = vib("--help")
    places = [done.out.index(f"\n  {command} ") for command in COMMANDS]
    assert places == sorted(places)
    assert "--install-completion" in done.out
    assert vib().out == done.out


def test_help_loads_nothing_heavy():
    code = (
        "import sys; from vib.cli import run; run(['--help']); "
        "heavy = {'numpy', 'scipy', 'pint', 'pydantic', 'rich', 'matplotlib', 'jinja2', 'meshio'}; "
        "sys.exit(', '.join(heavy & set(sys.modules)) or 0)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert (done.returncode, done.stderr) == (0, "")


def test_modes_loads_no_pictures_and_no_page(chain):
    code = (  # pint looks whether dask is there, which would bring the page's templates along
        f"import sys; sys.modules['dask'] = None; from vib.cli import run; run(['modes', {str(chain)!r}]); "
        "heavy = {'matplotlib', 'jinja2', 'meshio', 'scipy.signal', 'scipy.optimize', 'scipy.interpolate'}; "
        "sys.exit(', '.join(heavy & set(sys.modules)) or 0)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr


def test_version(vib):
    from vib import __version__

    assert vib("--version").out == f"vib {__version__}\n"


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["mods"], "Did you mean 'modes'?"),
        (["modes"], "STUDY.toml"),
        (["modes", "a.toml", "--cuont", "3"], "--count"),
        (["modes", "a.toml", "--count", "0"], "--count"),
        (["modes", "a.toml", "--count", "three"], "--count"),
        (["check", "a.toml", "--units", "furlongs"], "--units"),
        (["modes", "there-is-no.toml"], "no such file"),
    ],
)
def test_wrong_usage_exits_with_2_and_one_error(vib, arguments, said):
    done = vib(*arguments)
    assert done.status == 2
    assert done.out == ""
    assert done.err.startswith("error: ")
    assert said in done.err
    assert "Traceback" not in done.err
    assert "Value error" not in done.err


class Terminal(io.StringIO):
    encoding = "utf-8"

    def isatty(self):
        return True


@pytest.mark.parametrize(("no_color", "coloured"), [(None, True), ("1", False)])
def test_colour_on_a_terminal_only_and_not_with_no_color(monkeypatch, unstable, no_color, coloured):
    terminal = Terminal()
    monkeypatch.setattr(sys, "stdout", terminal)
    monkeypatch.setenv("TERM", "xterm-256color")
    monkeypatch.delenv("NO_COLOR", raising=False)
    if no_color:
        monkeypatch.setenv("NO_COLOR", no_color)
    assert run(["modes", str(unstable), "--quiet"]) == 1
    assert ("\x1b[" in terminal.getvalue()) == coloured


def test_no_colour_in_a_pipe(vib, unstable):
    assert "\x1b" not in vib("modes", unstable).out


def test_an_ascii_stream_gets_plain_words(chain):
    done = process("modes", chain, PYTHONIOENCODING="ascii")
    assert done.returncode == 0
    assert b"+/- Hz" in done.stdout
    assert b"OK: The system is stable" in done.stdout
    done.stdout.decode("ascii")


def test_json_is_alone_on_standard_output(beam):
    done = process("modes", beam, "--count", 2, "--json")
    assert done.returncode == 0
    assert len(json.loads(done.stdout)["modes"]) == 2
    assert b"remark: " in done.stderr


def test_a_reader_that_leaves_early_is_no_failure(chain):
    done = process("ring", chain, "--json", "--quiet", shell_end="| head -c 10")
    assert done.returncode == 0
    assert done.stderr == b""


@pytest.mark.parametrize("end", [">&-", "> /dev/full"])
def test_an_output_that_cannot_be_written_is_an_error(chain, end):
    if end.endswith("full") and not os.path.exists("/dev/full"):
        pytest.skip("this system has no /dev/full")
    done = process("modes", chain, "--quiet", shell_end=end)
    assert done.returncode == 2
    assert done.stderr.startswith(b"error: standard output")
    assert b"Traceback" not in done.stderr
    assert len(done.stderr.splitlines()) == 1


@pytest.mark.parametrize(
    ("raised", "status", "said"),
    [
        (KeyboardInterrupt(), 130, "interrupted"),
        (MemoryError(), 2, "not enough memory"),
        (ZeroDivisionError("of ours"), 2, "internal error (ZeroDivisionError: of ours)"),
        (RecursionError(), 2, "internal error (RecursionError)"),
    ],
)
def test_nothing_ends_in_a_traceback(monkeypatch, vib, chain, raised, status, said):
    def fail(path):
        raise raised

    monkeypatch.setattr("vib.study.read", fail)
    monkeypatch.delenv("VIB_DEBUG", raising=False)
    done = vib("modes", chain)
    assert done.status == status
    assert done.out == ""
    assert said in done.err
    assert "Traceback" not in done.err
    assert len(done.err.splitlines()) == 1


def test_a_fault_of_ours_can_be_looked_into(monkeypatch, vib, chain):
    monkeypatch.setattr("vib.study.read", lambda path: 1 // 0)
    monkeypatch.setenv("VIB_DEBUG", "1")
    assert "Traceback" in vib("modes", chain).err


def test_a_warning_of_a_library_becomes_a_remark(monkeypatch, vib, chain):
    import warnings

    from vib import study

    read = study.read

    def warn(path):
        warnings.warn("something\nodd", RuntimeWarning, stacklevel=1)
        return read(path)

    monkeypatch.setattr(study, "read", warn)
    with warnings.catch_warnings():
        warnings.simplefilter("always")
        done = vib("modes", chain)
    assert done.status == 0
    assert "remark: a library warns: something odd (RuntimeWarning)" in done.err


def test_control_characters_of_a_file_name_do_not_reach_the_terminal(vib):
    done = vib("modes", "evil\x1b[31m\nname.toml")
    assert done.status == 2
    assert "\x1b" not in done.err
    assert len(done.err.splitlines()) == 1

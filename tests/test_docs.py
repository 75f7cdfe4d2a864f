"""The pages: code blocks run, generated pages are up to date, links lead somewhere.

Console blocks run in this process, each page in a folder of its own that holds models/ as a clone does. A
command may end with status 1 (a mode inside a band), never with 2.
"""

import importlib.util
import re
import shlex
import shutil
from pathlib import Path

import pytest

from vib.cli import run
from vib.errors import VibError

TOP = Path(__file__).parent.parent
PAGES = ["README.md", "DEVELOPERS.md", *(f"docs/{path.name}" for path in sorted((TOP / "docs").glob("*.md")))]
BLOCK = re.compile(r"^```(\w+)\n(.*?)^```$", re.MULTILINE | re.DOTALL)
WITH_BLOCKS = [
    page
    for page in PAGES
    if {language for language, _ in BLOCK.findall((TOP / page).read_text("utf-8"))} & {"python", "console"}
]


def generator():
    spec = importlib.util.spec_from_file_location("make_pages", TOP / "docs" / "make_pages.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.mark.parametrize("page", WITH_BLOCKS)
def test_code_blocks_run(page, tmp_path, monkeypatch, capsys):
    shutil.copytree(TOP / "models", tmp_path / "models")
    monkeypatch.chdir(tmp_path)
    for language, code in BLOCK.findall((TOP / page).read_text("utf-8")):
        if language == "python":
            exec(compile(code, page, "exec"), {"__name__": "__main__"})
        elif language == "console":
            commands = [line.removeprefix("$ ") for line in code.splitlines() if line.startswith("$ ")]
            assert commands, code
            for command in commands:
                program, *arguments = shlex.split(command)
                assert program == "vib"
                assert run(arguments) in (0, 1), f"{command}: {capsys.readouterr().err}"


def test_pages_have_the_blocks_that_are_run():
    assert {"README.md", "docs/guide.md"} <= set(WITH_BLOCKS)


def test_the_fresh_machine_commands_are_what_a_clone_can_do():
    """One line each; the test command is the one that the check before a merge runs."""
    commands = [
        code for language, code in BLOCK.findall((TOP / "README.md").read_text("utf-8")) if language == "sh"
    ]
    assert [len(code.splitlines()) for code in commands] == [1, 1]
    page, tests = commands
    assert page.startswith("python3 -m venv .venv && .venv/bin/pip install . && .venv/bin/vib report models/")
    assert (TOP / page.split()[-1]).is_file()
    assert tests.split(" && ")[-1].strip() == ".venv/bin/python -m pytest"


@pytest.mark.parametrize("page", PAGES)
def test_links_lead_somewhere(page):
    folder = (TOP / page).parent
    for target in re.findall(r"\]\((?!https?://)([^)#]+)\)", (TOP / page).read_text("utf-8")):
        assert (folder / target).exists(), f"{page}: {target}"


@pytest.mark.parametrize("page", [page for page in PAGES if page != "DEVELOPERS.md"])
def test_every_page_for_users_carries_the_caution(page):
    caution = "Results support, and do not replace, review by a licensed engineer under the local code."
    assert caution in " ".join((TOP / page).read_text("utf-8").split())


def test_the_study_file_page_is_up_to_date():
    """If this fails: python docs/make_pages.py."""
    assert (TOP / "docs/study-file.md").read_text("utf-8") == generator().study_file_page()


NUMBER = re.compile(r"[-+]?\d+\.?\d*(?:e[-+]?\d+)?")


def test_the_validation_page_is_up_to_date():
    """Words alike, figures alike to five digits. Error bars and differences, the last two columns, vary by
    machine; the reference tests hold them.

    If this fails: python docs/make_pages.py.
    """
    written = (TOP / "docs/validation.md").read_text("utf-8").splitlines()
    made = generator().validation_page().splitlines()
    assert len(written) == len(made)
    for old, new in zip(written, made, strict=True):
        if new.startswith("| "):
            old, new = (line.rsplit("|", 3)[0] for line in (old, new))
        assert NUMBER.sub("#", old) == NUMBER.sub("#", new)
        for ours, theirs in zip(NUMBER.findall(old), NUMBER.findall(new), strict=True):
            assert float(ours) == pytest.approx(float(theirs), rel=2e-5, abs=1e-8), f"{old}\n{new}"


def test_the_errors_shown_in_the_guide_are_real(tmp_path):
    """The messages of the guide's example, from the skid starter with two slips put in."""
    from vib.study import read
    from vib.study.starters import starter_text

    text = starter_text("skid").replace('section = "rail"', 'section = "rial"', 1)
    path = tmp_path / "skid.toml"
    path.write_text(text.replace("mass = 210", 'mass = "210 lbf"'), encoding="utf-8")
    with pytest.raises(VibError) as caught:
        read(path)
    shown = re.search(r"^```text\n(.*?)^```$", (TOP / "docs/guide.md").read_text("utf-8"), re.M | re.S)
    assert shown is not None
    for line in shown[1].splitlines():
        assert line.removesuffix("...") in str(caught.value).replace(f"{path.parent}/", "")

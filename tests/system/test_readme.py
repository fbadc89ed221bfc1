"""Every example of the README runs as printed, in a folder that holds what a clone holds."""

import re
import shlex
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

pytestmark = pytest.mark.system

TOP = Path(__file__).parents[2]
README = (TOP / "README.md").read_text(encoding="utf-8")
BLOCKS = re.findall(r"```(sh|python)\n(.*?)```", README, flags=re.DOTALL)
COMMANDS = [line for kind, text in BLOCKS if kind == "sh" for line in text.splitlines() if line.startswith("gley ")]
PROGRAMS = [text for kind, text in BLOCKS if kind == "python"]


@pytest.fixture(scope="module")
def clone(tmp_path_factory):
    folder = tmp_path_factory.mktemp("readme")
    shutil.copytree(TOP / "sample_surveys", folder / "sample_surveys")
    return folder


def test_there_are_examples():
    assert len(COMMANDS) >= 5
    assert PROGRAMS


@pytest.mark.parametrize("command", COMMANDS)
def test_command(clone, command):
    words = shlex.split(command)
    program = Path(sys.executable).parent / words[0]
    finished = subprocess.run([program, *words[1:]], cwd=clone, capture_output=True, text=True, check=False)
    assert finished.returncode == 0, finished.stderr
    assert finished.stdout


@pytest.mark.parametrize("text", PROGRAMS)
def test_program(clone, text):
    finished = subprocess.run(
        [sys.executable, "-W", "error", "-c", text], cwd=clone, capture_output=True, text=True, check=False
    )
    assert finished.returncode == 0, finished.stderr
    assert "siderite" in finished.stdout


def test_links_and_pictures_exist():
    for target in re.findall(r"\]\(([^)]+)\)", README):
        assert (TOP / target).exists(), target

"""Sets Thalweg up in this checkout and starts it. Needs nothing but Python and, the first time, the network.

python3 resources/start.py               the window with a sample loaded; without a display the sample study in the terminal
python3 resources/start.py ARGUMENTS     the command line, e.g. `solve LiH` or `--help`
python3 resources/start.py --tests       formatter, linter, type checker and every test; further arguments go to pytest
"""

import importlib.util
import os
import shutil
import subprocess
import sys
from pathlib import Path

OLDEST, NEWEST = (3, 11), (3, 13)


def find_python():
    """Starts this script again under a Python that fits, or stops with a sentence. Kept to the syntax of old versions."""
    if OLDEST <= sys.version_info[:2] <= NEWEST:
        return
    for minor in range(NEWEST[1], OLDEST[1] - 1, -1):
        other = shutil.which("python3.%d" % minor)  # noqa: UP031
        if other and subprocess.call([other, "-c", ""]) == 0:
            sys.exit(subprocess.call([other, *sys.argv]))
    here = "%d.%d" % sys.version_info[:2]  # noqa: UP031
    sys.exit("Thalweg needs Python 3.11, 3.12 or 3.13: this is Python " + here + ". Install one of them and start this script with it.")


find_python()

import hashlib  # noqa: E402

TOP = Path(__file__).resolve().parents[1]
VENV = TOP / ".venv"
PYTHON = VENV / ("Scripts/python.exe" if os.name == "nt" else "bin/python")
STAMP = VENV / "thalweg-stamp"
SAMPLE = "LiH"
OUTPUT = Path("thalweg-output")
TEST_PROGRAMS = {"Xvfb": "xvfb", "xauth": "xauth", "xdotool": "xdotool"}
WORKERS = "2"


def main(arguments: list[str]) -> int:
    os.environ.setdefault("PYTHONUTF8", "1")
    tests = arguments[:1] == ["--tests"]
    system = load_system_libraries()
    if tests:
        install_packages(system, [*system.missing_libraries().values(), *missing_programs()])
        install(tests=True)
        return run_tests(arguments[1:])
    if not arguments and not system.has_display():
        install(tests=False)
        return sample_study()
    words = arguments or ["open", str(TOP / "sample_systems" / f"{SAMPLE}.xyz")]
    if words[0] == "open":
        install_packages(system, list(system.missing_libraries().values()))
    install(tests=False)
    return replace_by(["-m", "thalweg_app", *words])


def load_system_libraries():
    path = TOP / "app" / "thalweg_app" / "system_libraries.py"
    spec = importlib.util.spec_from_file_location("system_libraries", path)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def say(text: str) -> None:
    print(text, file=sys.stderr, flush=True)


# --- system packages -------------------------------------------------------------------------------------------------


def missing_programs() -> list[str]:
    """Packages of the programs that the tests drive a virtual screen with (Linux)."""
    if not sys.platform.startswith("linux"):
        return []
    return [package for program, package in TEST_PROGRAMS.items() if not shutil.which(program)]


def install_packages(system, packages: list[str]) -> None:
    """With apt when root; otherwise prints the exact line and stops."""
    if not packages:
        return
    line = system.install_line(packages)
    if not line:
        sys.exit(
            "Thalweg needs libraries that this system lacks: " + ", ".join(packages) + " (names of Debian packages). Install them and start again."
        )
    if os.geteuid() != 0:
        sys.exit("Thalweg needs libraries that this system lacks. Install them with the line below and start again.\n    " + line)
    say("Installing system packages: " + " ".join(packages))
    environment = {**os.environ, "DEBIAN_FRONTEND": "noninteractive"}
    for command in (["apt-get", "update", "-q"], ["apt-get", "install", "-y", "-q", "--no-install-recommends", *packages]):
        done = subprocess.run(command, env=environment, stdin=subprocess.DEVNULL, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True)
        if done.returncode != 0:
            say(done.stdout)
            sys.exit("The system packages could not be installed: see the lines above. By hand: " + line)


# --- the virtual environment -----------------------------------------------------------------------------------------


def install(tests: bool) -> None:
    """Makes .venv and installs the project into it, unless the stamp says that this is done already."""
    wanted = stamp_text()
    levels = ["tests"] if tests else ["tests", "program"]
    if PYTHON.exists() and STAMP.exists() and STAMP.read_text() in [f"{wanted} {level}" for level in levels]:
        return
    make_environment()
    say("Installing Thalweg and its libraries into .venv (once; some minutes and about 1 GB)")
    target = f"{TOP}[test]" if tests else str(TOP)
    command = [str(PYTHON), "-m", "pip", "install", "--no-input", "--disable-pip-version-check", "--editable", target]
    if not sys.stderr.isatty():
        command.insert(4, "--quiet")
    if subprocess.run(command, stdin=subprocess.DEVNULL, stdout=sys.stderr).returncode != 0:
        sys.exit("The libraries could not be installed: see the lines above. Check the network and start again; what is there already is kept.")
    STAMP.write_text(f"{wanted} {levels[0] if tests else 'program'}")
    if not tests:
        say("Compiling numerical kernels once for this machine (less than a minute)")
        subprocess.run([str(PYTHON), "-m", "thalweg_app.rehearsals"], stdin=subprocess.DEVNULL, stdout=sys.stderr)


def stamp_text() -> str:
    """Changes with the dependencies, the Python version and the place of the checkout (an editable install holds its path)."""
    parts = [(TOP / "pyproject.toml").read_bytes(), sys.version.encode(), str(TOP).encode()]
    return hashlib.sha256(b"\0".join(parts)).hexdigest()


def make_environment() -> None:
    """An environment with pip; one that does not run, or has an unfit Python, is made anew."""
    if PYTHON.exists() and environment_works():
        return
    if importlib.util.find_spec("venv") is None or importlib.util.find_spec("ensurepip") is None:
        package = f"python{sys.version_info[0]}.{sys.version_info[1]}-venv"
        install_packages(load_system_libraries(), [package])
    say(f"Making {VENV}")
    made = subprocess.run([sys.executable, "-m", "venv", "--clear", str(VENV)], stdin=subprocess.DEVNULL, stdout=sys.stderr)
    if made.returncode != 0:
        sys.exit("The virtual environment could not be made: see the lines above.")


def environment_works() -> bool:
    check = f"import sys, pip; sys.exit(not ({OLDEST} <= sys.version_info[:2] <= {NEWEST}))"
    return subprocess.run([str(PYTHON), "-c", check], stdin=subprocess.DEVNULL, capture_output=True).returncode == 0


# --- starting --------------------------------------------------------------------------------------------------------


def replace_by(arguments: list[str]) -> int:
    """The program takes the place of this process, so that Ctrl-C and the exit status are its own."""
    command = [str(PYTHON), *arguments]
    if os.name == "nt":
        return subprocess.call(command)
    sys.stdout.flush()
    os.execv(command[0], command)


def sample_study() -> int:
    """Without a display: the same study as the window would show, in the terminal."""
    OUTPUT.mkdir(exist_ok=True)
    files = ["--save", str(OUTPUT / f"{SAMPLE}.thalweg.json"), "--figure", str(OUTPUT / f"{SAMPLE}.png")]
    status = subprocess.call([str(PYTHON), "-m", "thalweg_app", "solve", SAMPLE, *files])
    print()
    print("There is no display here, so the sample study ran in the terminal. For the window, start this script on a desktop,")
    print("or over `ssh -X`, or with DISPLAY naming a screen. All commands: python3 resources/start.py --help")
    return status


def run_tests(arguments: list[str]) -> int:
    """Formatter, linter, type checker, tests: all of them run, and one failure makes the exit status 1."""
    environment = {**os.environ, "QT_QPA_PLATFORM": "offscreen", "OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1"}
    steps = {
        "formatter": ["ruff", "format", "--check", "."],
        "linter": ["ruff", "check", "."],
        "types": ["mypy"],
        "tests": ["pytest", "-n", WORKERS, *arguments],
    }
    failed = []
    for name, command in steps.items():
        say(f"-- {name}: {' '.join(command)}")
        if subprocess.run([str(PYTHON), "-m", *command], cwd=TOP, env=environment, stdin=subprocess.DEVNULL).returncode != 0:
            failed.append(name)
    say("Failed: " + ", ".join(failed) if failed else "Passed: " + ", ".join(steps))
    return 1 if failed else 0


if __name__ == "__main__":
    try:
        sys.exit(main(sys.argv[1:]))
    except KeyboardInterrupt:
        sys.exit(130)

"""Set Plumbwell up in its checkout and run it.

    python3 bootstrap.py app            open the window on a sample survey; without a display reduce it
    python3 bootstrap.py test [ARGS]    run all checks and tests; ARGS go to pytest

Everything is installed into ``.venv`` beside this file; nothing else on the machine is changed, except that
as root on Debian missing system libraries are installed. Only the standard library is used. The whole file
keeps to syntax that Python 2.7 can read, so that an old Python reaches the sentence that refuses it.
"""

from __future__ import print_function

import hashlib
import json
import os
import platform
import shutil
import subprocess
import sys

ROOT = os.path.dirname(os.path.realpath(__file__))
VENV = os.path.join(ROOT, ".venv")
OUTPUT = os.path.join(ROOT, "plumbwell_output")
SAMPLE = "tolly_bank_well"
FIGURES = ("figure.svg", "figure.png")

# What pip may still hear from the environment: where packages come from and how to reach them.
PIP_KEPT = frozenset(
    "PIP_" + name
    for name in (
        "INDEX_URL EXTRA_INDEX_URL NO_INDEX FIND_LINKS TRUSTED_HOST CONFIG_FILE CONSTRAINT PROXY CERT"
        " CLIENT_CERT TIMEOUT DEFAULT_TIMEOUT RETRIES CACHE_DIR NO_CACHE_DIR KEYRING_PROVIDER PREFER_BINARY"
    ).split()
)
# What would change which code runs, or how.
DROPPED = frozenset(
    "PYTHONPATH PYTHONHOME PYTHONSTARTUP PYTHONUSERBASE PYTHONINSPECT PYTHONOPTIMIZE PYTHONWARNINGS"
    " PYTHONEXECUTABLE PYTHONPLATLIBDIR PYTHONSAFEPATH PYTHONCASEOK PYTHONBREAKPOINT PYTHONVERBOSE"
    " PYTHONPROFILEIMPORTTIME __PYVENV_LAUNCHER__ VIRTUAL_ENV VIRTUAL_ENV_PROMPT PYTEST_ADDOPTS"
    " PYTEST_PLUGINS QT_PLUGIN_PATH QT_QPA_PLATFORM_PLUGIN_PATH QT_API PYTEST_QT_API".split()
)

# Debian's packages with the libraries that Qt needs: the first six to draw at all, the others for a window.
DEBIAN_PACKAGES = (
    "libgl1 libegl1 libxkbcommon0 libfontconfig1 libdbus-1-3 libglib2.0-0"
    " libxcb-cursor0 libxcb-icccm4 libxcb-keysyms1 libxkbcommon-x11-0 libxcb-shape0"
).split()


def refusal(version, executable):
    """The sentence that refuses this Python, or None when it will do."""
    if (3, 11) <= tuple(version[:2]) <= (3, 13):
        return None
    return (
        "Plumbwell needs Python 3.11, 3.12 or 3.13, and this is Python %d.%d (%s). "
        "Please start bootstrap.py with one of those, for example: python3.13 bootstrap.py app"
        % (version[0], version[1], executable)
    )


def clean_environment(environment):
    """A copy without what would mislead Python, pip, pytest or Qt; where packages come from is kept."""
    return dict(
        (name, value)
        for name, value in environment.items()
        if name.upper() not in DROPPED and (not name.upper().startswith("PIP_") or name.upper() in PIP_KEPT)
    )


def has_display(environment, system=sys.platform):
    """Whether a window could be shown."""
    if environment.get("QT_QPA_PLATFORM", "").split(":")[0] in ("offscreen", "minimal"):
        return False
    if system.startswith("linux"):
        return bool(environment.get("DISPLAY") or environment.get("WAYLAND_DISPLAY"))
    return True


def run(command, environment, **options):
    """Exit status of a command that shows its output."""
    sys.stdout.flush()
    return subprocess.call(command, env=environment, cwd=ROOT, **options)


# --- the environment in .venv ---------------------------------------------------------------------------


def venv_program(name):
    """Path of a program in .venv: "python" or "plumbwell"."""
    if os.name == "nt":
        return os.path.join(VENV, "Scripts", name + ".exe")
    return os.path.join(VENV, "bin", name)


def base():
    """What .venv stands on: another Python, prefix or path needs another .venv."""
    return [platform.python_version(), sys.base_prefix, ROOT]


def stamp(project_file, extra, foundation):
    """SHA-256 over all that decides what is installed."""
    import tomllib

    with open(project_file, "rb") as stream:
        tables = tomllib.load(stream)
    content = [tables["project"], tables["build-system"], list(foundation), extra]
    return hashlib.sha256(json.dumps(content, sort_keys=True).encode("utf-8")).hexdigest()


def read_note(name):
    """Text of a note left in .venv, empty when there is none."""
    try:
        with open(os.path.join(VENV, name), "r") as stream:
            return stream.read()
    except (OSError, ValueError):
        return ""


def write_note(name, text):
    """Leave a note in .venv, whole or not at all."""
    path = os.path.join(VENV, name)
    with open(path + ".part", "w") as stream:
        stream.write(text)
    os.replace(path + ".part", path)


def installed(extra):
    """Whether .venv holds what is asked for; one made for the tests serves the program too."""
    project_file = os.path.join(ROOT, "pyproject.toml")
    wanted = [stamp(project_file, name, base()) for name in ("test", extra)]
    return read_note("stamp") in wanted[: 1 if extra == "test" else 2] and all(
        os.path.exists(path) for path in (venv_program("python"), venv_program("plumbwell"))
    )


def remove_venv():
    """Take .venv away, also when it is a link."""
    if os.path.islink(VENV):
        os.remove(VENV)
    elif os.path.exists(VENV):
        shutil.rmtree(VENV)


def make_venv(environment):
    """Make .venv anew. Exit status."""
    import importlib.util

    if importlib.util.find_spec("ensurepip") is None:
        package = "python3.%d-venv" % sys.version_info[1]
        print("This Python cannot make virtual environments: ensurepip is missing.")
        if not apt_install([package], environment):
            return 1
    try:
        remove_venv()
    except OSError as error:
        print("Cannot remove the old .venv: %s. Is a program of it still running?" % error, file=sys.stderr)
        return 1
    # Inside an older .venv of ours the running interpreter would vanish with it.
    interpreter = getattr(sys, "_base_executable", None) or sys.executable
    status = run([interpreter, "-m", "venv", VENV], environment)
    if status == 0:
        write_note("base", json.dumps(base()))
    return status


def install(extra, environment):
    """Install the project with what it needs, unless the stamp says that it is there. Exit status."""
    if installed(extra):
        return 0
    if read_note("base") != json.dumps(base()) or not os.path.exists(venv_program("python")):
        print("Making .venv with Python %s ..." % platform.python_version())
        status = make_venv(environment)
        if status:
            print("Could not make %s" % VENV, file=sys.stderr)
            return status
    write_note("stamp", "")
    print("Installing what Plumbwell needs into .venv (several hundred MB; some minutes) ...")
    target = ".[%s]" % extra if extra else "."
    pip = [venv_program("python"), "-m", "pip", "install", "--quiet", "--disable-pip-version-check"]
    status = run(pip + ["--no-input", "--no-user", "--editable", target], environment)
    if status:
        print(
            "pip could not install Plumbwell; its own message stands above. It needs a package index the\n"
            "first time, and one of the systems that README.md names.",
            file=sys.stderr,
        )
        return status
    write_note("stamp", stamp(os.path.join(ROOT, "pyproject.toml"), extra, base()))
    return 0


def compile_package():
    """Compile the package where that is wanting: some environments forbid Python to keep what it compiles."""
    import compileall

    compileall.compile_dir(os.path.join(ROOT, "src", "plumbwell"), quiet=2)


# --- Qt's system libraries ------------------------------------------------------------------------------


def missing_libraries(ldd_output):
    """Names of the libraries that ldd did not find, each once, in order."""
    names = []
    for line in ldd_output.splitlines():
        name, arrow, found = line.partition("=>")
        if arrow and found.strip() == "not found" and name.strip() not in names:
            names.append(name.strip())
    return names


def qt_files(for_windows):
    """Qt's files whose libraries tell: those for drawing, or the plugin for windows under X."""
    import glob

    qt = os.path.join(VENV, "lib", "python3.%d" % sys.version_info[1], "site-packages", "PySide6")
    platforms = os.path.join(qt, "Qt", "plugins", "platforms")
    if for_windows:
        patterns = [os.path.join(platforms, "libqxcb.so")]
    else:
        patterns = [os.path.join(platforms, "libqoffscreen.so")]
        patterns += [os.path.join(qt, name + ".*.so") for name in ("QtGui", "QtSvg", "QtWidgets")]
    return [path for pattern in patterns for path in glob.glob(pattern)]


def qt_misses(for_windows, environment):
    """Names of the system libraries that Qt would not find."""
    files = qt_files(for_windows)
    if not files or shutil.which("ldd") is None:
        return []
    result = subprocess.run(
        ["ldd"] + files, env=dict(environment, LC_ALL="C"), stdout=subprocess.PIPE, stderr=subprocess.DEVNULL
    )
    return missing_libraries(result.stdout.decode("utf-8", "replace"))


def apt_install(packages, environment):
    """Install Debian packages as root, else print the command. Whether they were installed."""
    command = ["apt-get", "install", "-y", "--no-install-recommends", "--no-upgrade"] + list(packages)
    if os.path.exists("/etc/debian_version") and shutil.which("apt-get"):
        if os.geteuid() == 0:
            print("Installing Debian packages: %s ..." % " ".join(packages))
            quiet = dict(environment, DEBIAN_FRONTEND="noninteractive")
            # An index that is a little old may still do, so its refresh is allowed to fail.
            run(["apt-get", "update", "-qq"], quiet, stdin=subprocess.DEVNULL)
            if run(command, quiet, stdin=subprocess.DEVNULL, stdout=subprocess.DEVNULL) == 0:
                return True
            print("apt-get could not install them.")
        print("Please run:\n    sudo %s" % " ".join(command))
    else:
        print(
            "Please install them with your system's package manager. On Debian and Ubuntu they come with:\n"
            "    sudo %s" % " ".join(command)
        )
    return False


def check_qt_libraries(environment):
    """Whether Qt can draw here; sees to its system libraries on the way."""
    if not sys.platform.startswith("linux"):
        return True
    to_draw, for_windows = qt_misses(False, environment), qt_misses(True, environment)
    if not to_draw and not for_windows:
        return True
    root = os.geteuid() == 0
    if to_draw or root or has_display(environment):
        print("Qt needs system libraries that are missing: %s" % " ".join(to_draw or for_windows))
        apt_install(DEBIAN_PACKAGES, environment)
    return not qt_misses(False, environment)


# --- the two commands -----------------------------------------------------------------------------------


def sample_survey():
    """Folder of the sample that is shown first, or None when the checkout has none."""
    folder = os.path.join(ROOT, "sample_surveys")
    names = sorted(os.listdir(folder)) if os.path.isdir(folder) else []
    for name in [SAMPLE] + names:
        if os.path.isfile(os.path.join(folder, name, "survey.toml")):
            return os.path.join("sample_surveys", name)
    return None


def app(environment):
    """Open the window on a sample survey; without a display reduce it and say where the results are. Exit status."""
    status = install("", environment)
    if status:
        return status
    compile_package()
    if not check_qt_libraries(environment):
        print("Without these libraries the tables are written, but no figure.")
    sample = sample_survey()
    if sample is None:
        print("There is no survey in %s" % os.path.join(ROOT, "sample_surveys"), file=sys.stderr)
        return 1
    if has_display(environment) and not qt_misses(True, environment):
        print("plumbwell open %s" % sample.replace(os.sep, "/"))
        return run([venv_program("plumbwell"), "open", sample], environment)
    for name in FIGURES:
        # A figure of an earlier run must not be shown as one of this run.
        if os.path.exists(os.path.join(OUTPUT, name)):
            os.remove(os.path.join(OUTPUT, name))
    output = os.path.basename(OUTPUT)
    print("plumbwell reduce %s --out %s" % (sample.replace(os.sep, "/"), output))
    status = run([venv_program("plumbwell"), "reduce", sample, "--out", output], environment)
    if status not in (0, 3):
        print("plumbwell reduce ended with status %d" % status, file=sys.stderr)
        return status
    if status == 3:
        print("Done as far as possible: the docket holds findings that want a person's eye (status 3).")
    print("Tables: %s" % OUTPUT)
    for name in FIGURES:
        if os.path.exists(os.path.join(OUTPUT, name)):
            print("Figure: %s" % os.path.join(OUTPUT, name))
            break
    else:
        print("Figure: none was written; the docket in summary.json says why.")
    return 0


def test(arguments, environment):
    """Run the checks and the tests. Exit status."""
    status = install("test", environment)
    if status:
        return status
    compile_package()
    if not check_qt_libraries(environment):
        print("The tests draw, and cannot without these libraries.", file=sys.stderr)
        return 1
    failed = []
    if not arguments:
        for check in (["ruff", "check", "--no-cache", "."], ["mypy"]):
            print("== %s" % " ".join(check))
            if run([venv_program("python"), "-m"] + check, environment):
                failed.append(check[0])
    print("== pytest")
    status = run([venv_program("python"), "-m", "pytest"] + arguments, environment)
    if failed:
        print("failed besides pytest: %s" % ", ".join(failed), file=sys.stderr)
    return status or int(bool(failed))


def main(arguments):
    """Run the command that was named. Exit status."""
    sentence = refusal(sys.version_info, sys.executable)
    if sentence:
        print(sentence, file=sys.stderr)
        return 2
    environment = clean_environment(os.environ)
    if arguments[:1] == ["app"] and len(arguments) == 1:
        return app(environment)
    if arguments[:1] == ["test"]:
        return test(arguments[1:], environment)
    asked = arguments in (["-h"], ["--help"])
    print(__doc__.strip(), file=sys.stdout if asked else sys.stderr)
    return 0 if asked else 2


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))

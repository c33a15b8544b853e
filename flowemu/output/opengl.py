"""Whether this machine can draw scenes, found out without risking the process."""

from __future__ import annotations

import ctypes
import os
import subprocess
import sys
from functools import lru_cache

LIBRARIES = ("libEGL.so.1", "libGL.so.1", "libOSMesa.so.8", "libOSMesa.so")
WINDOWS = {"libEGL.so.1": "vtkEGLRenderWindow", "libOSMesa.so.8": "vtkOSOpenGLRenderWindow"}
ADVICE = "install an OpenGL library (Debian, Ubuntu: apt-get install libegl1 libgl1; Fedora: dnf install mesa-libEGL)"
PATIENCE_S = 120.0
TRIAL = """
import numpy, pyvista
plotter = pyvista.Plotter(off_screen=True, window_size=(32, 32))
plotter.set_background("white")
plotter.add_mesh(pyvista.Sphere(), color="black")
shot = plotter.screenshot(return_img=True)
raise SystemExit(0 if int(shot.min()) < int(shot.max()) else 1)
"""


def prefer_headless() -> None:
    """Where no display is set, tell VTK which library to draw with, lest it look for a display first."""
    if sys.platform.startswith("linux") and not os.environ.get("DISPLAY"):
        for library, window in WINDOWS.items():
            if loads(library):
                os.environ.setdefault("VTK_DEFAULT_OPENGL_WINDOW", window)
                return


@lru_cache(maxsize=1)
def missing_opengl() -> str | None:
    """None where scenes can be drawn, else one line that says what is missing and what to install.

    A trial picture is drawn in a child process, since VTK may end the process where it finds no driver.
    """
    prefer_headless()
    if sys.platform.startswith("linux") and not any(loads(name) for name in LIBRARIES):
        return f"no 3D views: there is no OpenGL library; {ADVICE}"
    try:
        trial = subprocess.run([sys.executable, "-c", TRIAL], capture_output=True, timeout=PATIENCE_S, check=False)
    except (OSError, subprocess.TimeoutExpired):
        return f"no 3D views: drawing off-screen does not work here; {ADVICE}"
    if trial.returncode != 0:
        return f"no 3D views: drawing off-screen does not work here; {ADVICE}"
    return None


def loads(name: str) -> bool:
    """Whether a shared library can be loaded."""
    try:
        ctypes.CDLL(name)
    except OSError:
        return False
    return True

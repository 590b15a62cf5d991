"""The same functions run as plain Python, with the compiler switched off."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import numpy as np

from foredeck.smoothing.catalogue import METHODS, fit
from foredeck.smoothing.weighted_forms import fit_forms

PROGRAM = """
import json, numpy as np
from foredeck.compiled.search import search
from foredeck.smoothing.catalogue import METHODS, fit
assert not hasattr(search, "py_func"), "the compiler is still on"
y = np.array(json.loads(input()))
print(json.dumps({name: fit(name, y, 4).forecast(5).tolist() for name in METHODS}))
"""


TWINS = """
import numpy as np
from references import plain_smoothing as plain
from foredeck.compiled.recursions import MULTIPLICATIVE, croston, run
y = np.array([9.0, 12.0, 8.0, 0.5, 11.0, 14.0])
start = dict(level=10.0, trend=0.2, season=[0.9, 1.1])
forecasts, level, trend, season = plain.smoothing(
    y, alpha=0.3, beta=0.2, gamma=0.4, phi=0.9, kind="multiplicative", **start)
state, errors = np.array([10.0, 0.2, 0.9, 1.1]), np.empty(6)
run(y, 0, MULTIPLICATIVE, MULTIPLICATIVE, 2, False, np.array([0.3, 0.2, 0.4, 0.9]), state, errors, np.empty((3, 6)))
np.testing.assert_allclose(y - errors, forecasts, rtol=1e-12)
np.testing.assert_allclose(state, [level, trend, *season], rtol=1e-12)
demand, state, one_step = np.array([0.0, 3.0, 0.0, 2.0, 0.0]), np.empty(2), np.empty(5)
croston(demand, 0.2, 0.9, state, one_step)
forecasts, size, gap = plain.croston(demand, 0.2, 0.9)
np.testing.assert_allclose(one_step, forecasts, rtol=1e-12)
np.testing.assert_allclose(state, [size, gap], rtol=1e-12)
"""


FORMS = """
import json, numpy as np
from foredeck.smoothing.weighted_forms import fit_forms
fits = fit_forms(np.array(json.loads(input())), 4)
print(json.dumps([fits.weights.tolist(), fits.fitted.tolist(), fits.states.tolist()]))
"""


def plain_python(program, given=""):
    """Run a program with the compiler off; return what it printed."""
    tests = str(Path(__file__).parents[1])
    paths = os.pathsep.join(filter(None, [tests, os.environ.get("PYTHONPATH", "")]))
    done = subprocess.run(
        [sys.executable, "-c", program], input=given, capture_output=True, text=True, check=False,
        env={**os.environ, "NUMBA_DISABLE_JIT": "1", "PYTHONPATH": paths},
    )
    assert done.returncode == 0, done.stderr
    return done.stdout


def test_the_recursions_equal_their_twins_to_1e_12_with_the_compiler_off():
    plain_python(TWINS)


def test_every_method_gives_the_same_forecasts_to_1e_8_with_the_compiler_off():
    rng = np.random.default_rng(2)
    y = 50 + np.tile([-5.0, 8, -1, -2], 3) + rng.normal(size=12)
    plain = json.loads(plain_python(PROGRAM, json.dumps(y.tolist())))
    for name in METHODS:
        np.testing.assert_allclose(plain[name], fit(name, y, 4).forecast(5), rtol=1e-8, err_msg=name)


def test_fifteen_forms_are_the_same_to_the_last_bits_with_the_compiler_off():
    rng = np.random.default_rng(3)
    y = 50 + np.tile([-5.0, 8, -1, -2], 6) + rng.normal(size=24)
    plain = json.loads(plain_python(FORMS, json.dumps(y.tolist())))
    fits = fit_forms(y, 4)
    for ours, theirs in zip((fits.weights, fits.fitted, fits.states), plain, strict=True):
        np.testing.assert_allclose(ours, theirs, rtol=1e-11, atol=1e-12)

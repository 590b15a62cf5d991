"""The same functions run as plain Python, with the compiler switched off."""

from __future__ import annotations

import json
import os
import subprocess
import sys

import numpy as np

from foredeck.smoothing.catalogue import METHODS, fit

PROGRAM = """
import json, numpy as np
from foredeck.compiled.search import search
from foredeck.smoothing.catalogue import METHODS, fit
assert not hasattr(search, "py_func"), "the compiler is still on"
y = np.array(json.loads(input()))
print(json.dumps({name: fit(name, y, 4).forecast(5).tolist() for name in METHODS}))
"""


def test_every_method_gives_the_same_forecasts_to_1e_8_with_the_compiler_off():
    rng = np.random.default_rng(2)
    y = 50 + np.tile([-5.0, 8, -1, -2], 3) + rng.normal(size=12)
    done = subprocess.run(
        [sys.executable, "-c", PROGRAM], input=json.dumps(y.tolist()), capture_output=True, text=True,
        env={**os.environ, "NUMBA_DISABLE_JIT": "1"}, check=False,
    )
    assert done.returncode == 0, done.stderr
    plain = json.loads(done.stdout)
    for name in METHODS:
        np.testing.assert_allclose(plain[name], fit(name, y, 4).forecast(5), rtol=1e-8, err_msg=name)

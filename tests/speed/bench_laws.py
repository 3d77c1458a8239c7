"""Time that `predict` takes for each shipped recipe.

Run it: ``python tests/speed/bench_laws.py [NAME ...]``. Aim: about 2 s each, of CPU time on one
core: the law, its levels at 10 % ... 1e-9 and its curve on a 0.05 dB grid; beside it the time of
the moments, which verdicts ask for.
"""

from __future__ import annotations

import argparse
import time
from pathlib import Path

from wavegen.laws.moments import moment_of
from wavegen.production.law_walk import law_of_recipe
from wavegen.production.predict import predict
from wavegen.production.prepare import find_loop
from wavegen.recipe.load import load_recipe

RECIPES = Path(__file__).parents[2] / "recipes"
AIM_S = 2.0


def main():
    """Print seconds."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("names", nargs="*", help="recipes; all of them if none is given")
    names = parser.parse_args().names or sorted(path.stem for path in RECIPES.glob("*.yaml"))
    for name in names:
        loaded = load_recipe(RECIPES / f"{name}.yaml")
        start = time.process_time()
        found = predict(loaded)
        seconds = time.process_time() - start
        flag = " (over the aim)" if seconds > AIM_S else ""
        if found["law"] is None:
            print(f"{name:31s} {seconds:5.2f} s  no law: {found['no_law']}{flag}")
            continue
        law = law_of_recipe(loaded.recipe.signal, loaded.recipe.stages, find_loop(loaded)[1][0][1])
        start = time.process_time()
        second, third = (moment_of(law, order)[0] for order in (2, 3))
        moments = time.process_time() - start
        level_db = {row["probability"]: row["level_db"] for row in found["law"]["levels"]}[1e-4]
        print(
            f"{name:31s} {seconds:5.2f} s, moments {moments:5.2f} s  {level_db:6.3f} dB at 0.01 %  "
            f"{second:.4f} {third:.4f}  {law.name}{flag}"
        )


if __name__ == "__main__":
    main()

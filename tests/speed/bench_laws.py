"""Time that the law of each shipped recipe takes.

Run it: ``python tests/speed/bench_laws.py [NAME ...]``. Aim: about 2 s each, of CPU time on one
core, levels at 10 % ... 1e-9 included.
"""

from __future__ import annotations

import argparse
import time
from pathlib import Path

from wavegen.laws.term import NoLaw
from wavegen.production.law_walk import law_of_recipe
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_recipe

RECIPES = Path(__file__).parents[2] / "recipes"
PROBABILITIES = [10.0**-decade for decade in range(1, 10)]
AIM_S = 2.0


def main():
    """Print seconds."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("names", nargs="*", help="recipes; all of them if none is given")
    names = parser.parse_args().names or sorted(path.stem for path in RECIPES.glob("*.yaml"))
    for name in names:
        loaded = load_recipe(RECIPES / f"{name}.yaml")
        site = prepare(loaded).site
        start = time.process_time()
        law = law_of_recipe(loaded.recipe.signal, loaded.recipe.stages, site)
        if isinstance(law, NoLaw):
            print(f"{name:28s}         no law: {law.reason}")
            continue
        levels = law.level_db(PROBABILITIES)
        seconds = time.process_time() - start
        flag = " (over the aim)" if seconds > AIM_S else ""
        print(f"{name:28s} {seconds:6.2f} s  {levels[3]:6.3f} dB at 0.01 %  {law.name}{flag}")


if __name__ == "__main__":
    main()

# %% [markdown]
# # How many radio supplies out of a hundred keep their requirement?
#
# A narrowboat's radio supply (invented), built several times with parts as they come. The cell marks let an editor run
# this step by step; `python examples/radio_yield.py` runs it through.

# %%
from pathlib import Path

import buckdesign

HERE = Path(__file__).parent if "__file__" in globals() else Path("examples")
design = buckdesign.read_design(HERE / "radio_as_built.design.toml")

# %% [markdown]
# ## Units drawn with usual tolerances
# One row a unit: what its values are, and what it does at the point where it is worst.

# %%
units = buckdesign.tolerance(design, units=200, seed=1)
summary = units.attrs["summary"]
print(f"yield {summary['yield']:.1%}, between {summary['yield_low']:.1%} and {summary['yield_high']:.1%}")

# %% [markdown]
# ## What fails, and which part would help

# %%
for name, one in summary["requirements"].items():
    if one["yield"] < 1.0:
        print(f"{name}: {one['yield']:.1%}")
for one in summary["tighter"][:3]:
    print(f"half the tolerance of {one['key']}: {one['yield']:.1%}")

# %% [markdown]
# ## The same over a few turns and feedback resistors
# One process, because a cell has no `__main__` to protect.

# %%
table = buckdesign.sweep(HERE / "rail_capacitor.study.toml", jobs=1)
best = table.attrs["summary"]["best"][0]
print(f"least ripple and loss together: {best['ripple_v'] * 1e3:.0f} mV, {best['total_loss_w']:.2f} W")

"""A plan and a drawer to begin from: invented, small, and complete enough to solve.

The five files of the drawer show each way a row may be written; the plan's comments say how to go on.
"""

from __future__ import annotations

import os
import shlex

from partpick.errors import OutputError
from partpick.report.files import Output, check_outputs, write_outputs

_PLAN = """\
# A plan to begin from. Workshop, stock and prices are invented; change everything.
#
#     partpick bands plan.toml --drawer drawer
#     partpick bands plan.toml --drawer drawer --bom parts.csv --sheet sheet.html
#     partpick parts --drawer drawer
#
# `parts.csv` is what to buy, `sheet.html` the page to wind and solder from. Where nothing fits, the
# answer names the limit that rules everything out and what it would have to be.
#
# The folder `drawer` holds what is in stock, one CSV file a kind. A row is one part (`value`) or a
# whole family of preferred values (`series`, `from`, `to`; then `quantity` counts each value). An empty
# `quantity` means as many as wanted, 0 means none. Delete a file there to use the shipped parts of
# that kind instead.

title = "Listening set, two bands (invented, Skerry Point workshop)"
switching = "separate"       # each band has its own capacitors across the one coil

[limits]
error = "0.5 %"              # resonance off target, at most
parts_per_band = 2
inductors = 1

[stray]
capacitance = "10 pF"        # wiring, switch and device

[[band]]
name = "coast"
at = "3.65 MHz"

[[band]]
name = "islands"
at = "7.1 MHz"

# To go on, take the # away from one of these:
#
# trimmer = "3 pF..20 pF"    # below a band: set on the bench, the error limit is off for it
#
# [[band]]                   # a range, tuned by one element ...
# name = "weather"
# from = "5.2 MHz"
# to = "5.5 MHz"
#
# [tuning]                   # ... which is
# kind = "variable capacitor"
# low = "12 pF"
# high = "150 pF"
"""

_CAPACITORS = """\
value,series,from,to,grade,tolerance,tempco_ppm_per_k,q,voltage,quantity,unit_price,label,source
,E12,10 pF,1 nF,C0G,5 %,0,1000,100 V,10,0.05,,invented stock
,E6,100 pF,2.2 nF,mica,1 %,35,1500,500 V,4,0.80,,invented stock
47 pF,,,,N750,5 %,-750,500,100 V,6,0.10,,invented stock
98.6 pF,,,,mica,0.5 %,35,1500,500 V,1,0.80,98.6 pF mica measured,invented stock
"""

_INDUCTORS = """\
value,series,from,to,tolerance,q,q_frequency,self_capacitance,current,quantity,unit_price,label,source
,E6,1 \u00b5H,47 \u00b5H,10 %,40,7.9 MHz,1.5 pF,0.3 A,5,0.20,moulded,invented stock
"""

_WIRES = """\
name,bare_diameter,overall_diameter,price_per_m,source
enamelled 0.40 mm,0.40 mm,0.439 mm,0.08,invented stock
enamelled 0.63 mm,0.63 mm,0.679 mm,0.15,invented stock
tinned 1.0 mm,1.0 mm,1.0 mm,0.40,invented stock
"""

_FORMERS = """\
name,support,diameter,winding_length,pitch,tolerance,tempco_ppm_per_k,loss_tangent,quantity,unit_price,source
grey tube 16 mm,tube,16 mm,30 mm,,1 %,100,0.01,6,0.30,invented stock
grey tube 25 mm,tube,25 mm,40 mm,twin,1 %,100,0.01,4,0.40,invented stock
grooved former 25 mm,ribbed,25 mm,40 mm,1.5 mm,0.5 %,30,0.001,2,2.50,invented stock
drill shank 8 mm,mandrel,8 mm,16 mm,,2 %,25,0,,0,invented stock
"""

_CORES = """\
name,shape,outer_diameter,inner_diameter,height,material,permeability,q,frequency_low,frequency_high,\
tolerance,tempco_ppm_per_k,quantity,unit_price,source
powder ring 13 mm,ring,13 mm,7.5 mm,5 mm,powder,9,200,2 MHz,20 MHz,5 %,95,8,0.60,invented stock
"""


def starter_files() -> dict[str, str]:
    """Return the text of each file by its path below the starter's folder."""
    return {
        "plan.toml": _PLAN,
        "drawer/capacitors.csv": _CAPACITORS,
        "drawer/inductors.csv": _INDUCTORS,
        "drawer/wires.csv": _WIRES,
        "drawer/formers.csv": _FORMERS,
        "drawer/cores.csv": _CORES,
    }


def write_starter(directory: str | os.PathLike[str], force: bool) -> None:
    """Write the plan and the drawer into a folder, which is made where it is missing.

    Parameters
    ----------
    directory : str or path
        The folder.
    force : bool
        Whether files of the same names may be replaced; others are left alone either way.

    Raises
    ------
    OutputError
        One of the files is there already, or cannot be written; then none is written.
    """
    folder = os.fspath(directory)
    if not folder or "\0" in folder:
        raise OutputError("the starter needs the name of a folder")
    files = {os.path.join(folder, *path.split("/")): text for path, text in starter_files().items()}
    check_outputs([path for path in files if os.path.lexists(path)], force)
    try:
        os.makedirs(os.path.join(folder, "drawer"), exist_ok=True)
    except OSError as error:
        reason = (error.strerror or str(error)).lower()
        raise OutputError(f"cannot make the folder {folder}: {reason}") from None
    check_outputs(files, force)
    write_outputs([Output(path, text.encode()) for path, text in files.items()], force)


def next_steps(directory: str | os.PathLike[str]) -> str:
    """Return what to do with a starter, each command as it is typed."""
    folder = os.fspath(directory)
    plan, drawer, sheet = (shlex.quote(os.path.join(folder, name)) for name in ("plan.toml", "drawer", "sheet.html"))
    return (
        f"A plan and a drawer to begin from are in {folder}\n"
        "Next, what to build, then the page to wind and solder from:\n"
        f"  partpick bands {plan} --drawer {drawer}\n"
        f"  partpick bands {plan} --drawer {drawer} --sheet {sheet}\n"
        "Then open the plan and change it: its comments say how to go on.\n"
    )

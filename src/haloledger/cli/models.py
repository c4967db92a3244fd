"""`haloledger models`: list the halo models, explain one, plot one."""

from __future__ import annotations

import click

from haloledger.cli.lazy import Command, option

EXAMPLE = """
haloledger models
haloledger models blended
haloledger models blended --plot blended.svg --mass 12 --mass 14
"""

FEW = (12.0, 13.5, 14.5)  # masses in the table of all models


@click.command("models", cls=Command, example=EXAMPLE, context_settings={"help_option_names": ["-h", "--help"]})
@click.argument("model", metavar="[NAME|FILE]", required=False)
@option("--plot", group="Picture", metavar="FILE", help="Draw density and projection into a .png or .svg file.")
@option(
    "--mass",
    group="Picture",
    type=click.FloatRange(9, 16.5),
    multiple=True,
    metavar="LOG10_M200C",
    help="Mass to draw; may be repeated.",
)
@option(
    "--redshift",
    group="Both",
    type=click.FloatRange(0, 5),
    default=0.0,
    show_default=True,
    metavar="Z",
    help="Redshift of the haloes.",
)
@option("--cosmology", group="Both", default="Planck18", show_default=True, help="Cosmology, by its name in astropy.")
def command(model: str | None, plot: str | None, mass: tuple[float, ...], redshift: float, cosmology: str) -> None:
    """List the halo models with the gas each keeps, or explain one.

    The kept fraction inside r500c, r200c and 2 r200c is printed against the cosmic share of the total mass there, and
    marked where the model holds more than the stars leave.
    """
    if model is None and (plot or mass):
        raise click.UsageError("--plot and --mass need a model. Write: haloledger models blended --plot a.png")
    from haloledger.cosmos.background import cosmology as named
    from haloledger.gas.inventory import inventory
    from haloledger.gas.models import load_model, model_names
    from haloledger.report.models_page import show_model, show_models
    from haloledger.report.screen import console

    cosmos = named(cosmology)
    if model is None:
        show_models([inventory(load_model(n), cosmos, FEW, redshift) for n in model_names()], FEW, console())
        return
    chosen = load_model(model)
    show_model(inventory(chosen, cosmos, z=redshift), console())
    if plot:
        _plot(chosen, cosmos, plot, mass, redshift)


def _plot(model, cosmos, plot: str, mass: tuple[float, ...], redshift: float) -> None:
    from haloledger.cli.talk import say
    from haloledger.gas.curves import LOG_M200C, curves
    from haloledger.report.figures import model_figure, save

    path = save(model_figure(curves(model, cosmos, mass or LOG_M200C, redshift)), plot)
    say(f"Picture written: {path}")

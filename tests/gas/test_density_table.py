"""A user's own n_e(r/r200c, M): a worked example, a round trip through a shipped model, and what is refused."""

import numpy as np
import pytest
from astropy.table import Table
from gas_reference import column_by_quad, write_model

from haloledger.errors import InputError
from haloledger.gas.models import load_model
from haloledger.gas.projection import projection

RADII = np.geomspace(0.003, 1.0, 60)
MASSES = (11.0, 12.0, 13.0)
BODY = '[shape]\nkind = "table"\nfile = "mine.ecsv"\nat_redshift = 0.1\n'


def write_table(folder, n_e, radii=RADII, masses=MASSES, unit="cm-3", name="mine.ecsv"):
    rows = [(r, m, n) for m, line in zip(masses, n_e, strict=True) for r, n in zip(radii, line, strict=True)]
    table = Table(rows=rows, names=["r_over_r200c", "log_m200c", "n_e"])
    table["n_e"].unit = unit
    table.write(folder / name, overwrite=True)


def test_example(planck, tmp_path):
    """n_e = 1e-4 cm-3 x / (0.1 + x)^2.5, heavier haloes denser by M^0.1: the file, the model, a column."""
    write_table(tmp_path, [1e-4 * 10 ** (0.1 * (m - 12)) * RADII / (0.1 + RADII) ** 2.5 for m in MASSES])
    model = write_model(tmp_path, BODY)
    assert model.depends_on == ("mass",)
    x = np.array([0.05, 0.3, 0.9])
    assert model.density_cm3(x, 12.5, 0.1, 7, planck) == pytest.approx(1e-4 * 10**0.05 * x / (0.1 + x) ** 2.5, rel=1e-4)
    b, r200c = 0.35, float(planck.r200c_kpc(12.5, 0.1))
    got = float(projection(model, planck).dm_rest(b, 12.5, 0.1, 7.0, r200c))
    assert got == pytest.approx(column_by_quad(model, planck, b, 12.5, 0.1, 7.0), rel=2e-4)
    s = np.linspace(0, np.sqrt(1 - b**2), 20001)
    x = np.hypot(b, s)
    by_hand = 2e3 * r200c * np.trapezoid(1e-4 * 10**0.05 * x / (0.1 + x) ** 2.5, s)
    assert got == pytest.approx(by_hand, rel=3e-4)


def test_round_trip_of_the_textbook_model(planck, tmp_path):
    """The yardstick's own densities at one concentration, written out and read back."""
    yardstick = load_model("textbook-modified-nfw")
    masses = np.array([11.0, 12.0, 13.0])
    write_table(tmp_path, [yardstick.density_cm3(RADII, m, 0.1, 8.0, planck) for m in masses])
    mine = write_model(tmp_path, BODY)
    b = np.array([0.02, 0.2, 0.5, 0.95])
    for log_m, z in ((11.0, 0.1), (12.6, 0.4)):
        halo = (b, log_m, z, 8.0, planck.r200c_kpc(log_m, z))
        got, expected = (projection(m, planck).dm_rest(*halo) for m in (mine, yardstick))
        assert got == pytest.approx(expected, rel=5e-4)
    assert mine.gas_share(12.0, 0.1, 5.0, planck) == pytest.approx(0.75, rel=1e-4)


def test_kept_section_keeps_the_shape_and_replaces_the_amount(planck, tmp_path):
    write_table(tmp_path, [1e-3 / (0.1 + RADII) ** 2] * 3)
    free = write_model(tmp_path, BODY, name="free")
    held = write_model(tmp_path, BODY + '[kept]\nlaw = "constant"\nkept = 0.4\n', name="held")
    assert held.gas_share(12.0, 0.3, 7.0, planck) == pytest.approx(0.4, rel=1e-12)
    x = np.array([0.1, 0.8])
    ratio = held.density_cm3(x, 12, 0.3, 7, planck) / free.density_cm3(x, 12, 0.3, 7, planck)
    assert ratio[0] == pytest.approx(ratio[1], rel=1e-12)


def test_units_convert_and_masses_beyond_take_the_nearest(planck, tmp_path):
    write_table(tmp_path, [1e2 / (0.1 + RADII) ** 2] * 3, unit="m-3")
    model = write_model(tmp_path, BODY)
    at = model.density_cm3(0.4, np.array([9.5, 12.0, 15.0]), 0.1, 7, planck)
    assert at == pytest.approx(np.full(3, 1e-4 / 0.25), rel=1e-4)


def test_a_changed_table_is_another_model(tmp_path):
    write_table(tmp_path, [1e-4 / RADII] * 3)
    first = write_model(tmp_path, BODY)
    write_table(tmp_path, [2e-4 / RADII] * 3)
    assert load_model(str(tmp_path / "mine.toml")) != first


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (
            lambda t: t.rename_column("n_e", "ne"),
            r"mine.ecsv: no column 'n_e' among \['r_over_r200c', 'log_m200c', 'ne'\]",
        ),
        (lambda t: t["n_e"].__setitem__(3, 0.0), "row 4: n_e = 0. Write a density above 0 cm-3; end the table"),
        (lambda t: t["n_e"].__setitem__(5, np.nan), "row 6: n_e = nan"),
        (lambda t: t["log_m200c"].__setitem__(0, 1e12), r"row 1: log_m200c = 1e\+12. Write a log10 mass"),
        (lambda t: t["r_over_r200c"].__setitem__(0, -0.1), "row 1: r_over_r200c = -0.1. Write a radius above 0"),
        (lambda t: t.remove_row(7), "179 rows for 60 radii and 3 masses. Write the same radii"),
        (lambda t: setattr(t["n_e"], "unit", "kpc"), "n_e is in 'kpc', not convertible to cm-3"),
    ],
)
def test_refusals(change, message, tmp_path):
    write_table(tmp_path, [1e-4 / RADII] * 3)
    table = Table.read(tmp_path / "mine.ecsv")
    change(table)
    table.write(tmp_path / "mine.ecsv", overwrite=True)
    with pytest.raises(InputError, match=message):
        write_model(tmp_path, BODY)


def test_boundary_beyond_the_table_and_missing_file(tmp_path):
    write_table(tmp_path, [1e-4 / RADII] * 3)
    with pytest.raises(InputError, match=r"boundary = 1.5 is beyond this shape, which ends at 1"):
        write_model(tmp_path, BODY, boundary=1.5)
    with pytest.raises(InputError, match=r"other.csv: no such file. Write the path of the density table"):
        write_model(tmp_path, BODY.replace("mine.ecsv", "other.csv"))

"""Small skies for the ledger tests: tables in memory with everything placed by hand."""

import numpy as np
from astropy.table import Table

HERE = (150.0, 20.0)


def galaxy_at(planck, log_m200c, z, impact_kpc, angle_deg=0.0, name="G1"):
    """A galaxy with a given halo mass whose centre passes the line at HERE at `impact_kpc`, due north by default."""
    step = np.degrees(np.arcsin(impact_kpc / planck.angular_distance_kpc(z)))
    dec = HERE[1] + step * np.cos(np.radians(angle_deg))
    ra = HERE[0] + step * np.sin(np.radians(angle_deg)) / np.cos(np.radians(HERE[1]))
    return {"id": name, "ra": ra, "dec": dec, "z": z, "log_m200c": log_m200c, "log_m200c_err": 0.0}


def galaxies(*rows) -> Table:
    """A galaxy table."""
    return Table(rows=list(rows))


def burst(name="B1", z=0.5, dm=500.0, **more) -> dict:
    """A burst at HERE."""
    return {"burst": name, "ra": HERE[0], "dec": HERE[1], "z": z, "dm": dm, **more}


def bursts(*rows) -> Table:
    """A burst table."""
    return Table(rows=list(rows))


def group(name="C1", z=0.1, log_mass=14.0, mass_def="200c", ra=HERE[0], dec=HERE[1], **more) -> dict:
    """A group at HERE."""
    return {"id": name, "ra": ra, "dec": dec, "z": z, "log_mass": log_mass, "mass_def": mass_def, **more}


def member_host(name="H", group_id="C1", z=0.1) -> dict:
    """A galaxy at HERE that names its group."""
    return {
        "id": name,
        "ra": HERE[0],
        "dec": HERE[1],
        "z": z,
        "log_mstar": 10.5,
        "log_mstar_err": 0.1,
        "group_id": group_id,
    }


def fixed_concentration(tmp_path, model: str, value: float) -> str:
    """The shipped model with a concentration that is a number, as a user's own file."""
    from haloledger.paths import data_folder

    text = (data_folder("halo_models") / f"{model}.toml").read_text(encoding="utf-8")
    assert 'concentration = "dutton2014"' in text
    text = text.replace('concentration = "dutton2014"', f"concentration = {value}")
    path = tmp_path / f"{model}-c{value:g}.toml"
    path.write_text(text.replace(f'name = "{model}"', f'name = "{path.stem}"'), encoding="utf-8")
    return str(path)

"""Where the data that travels with the package lies, in a wheel and in an editable install alike."""

from importlib.resources import files
from pathlib import Path


def data_folder(name: str) -> Path:
    """Folder `halo_models` or `demo_sightlines` as a path.

    An editable install leaves the folders at the top of the checkout, a wheel puts them inside the package.
    """
    inside = Path(str(files("haloledger"))) / name
    return inside if inside.is_dir() else Path(__file__).parents[2] / name

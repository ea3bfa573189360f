"""Where the folders that travel with the program are: templates, static, sample_data."""

from pathlib import Path


def resource(name: str) -> Path:
    """The folder `name` inside the installed package, else beside it (an editable install or a clone).

    Raises FileNotFoundError when it is in neither place: the installation is broken.
    """
    package = Path(__file__).resolve().parent
    for folder in (package / name, package.parent / name):
        if folder.is_dir():
            return folder
    raise FileNotFoundError(f"The folder {name!r} is missing from this installation of Steelyard.")

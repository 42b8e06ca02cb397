"""Reading a run file, and everything that can be wrong with it."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Annotated, Any

from pydantic import Field, PrivateAttr, ValidationError

from cropstress.crops import CropProfile, load_crop
from cropstress.crops.profile_files import is_profile_path
from cropstress.crops.reading import Location, faults_of
from cropstress.errors import Fault, InputError
from cropstress.runfile.layers import (
    Layer,
    Raw,
    changed_paths,
    merged,
    path_faults,
    read_layers,
    without_machine,
)
from cropstress.runfile.tables import (
    Air,
    AreaGrid,
    Change,
    Compute,
    CropEntry,
    Grid,
    Maps,
    Model,
    Output,
    Places,
    Seasons,
    SowingGrid,
    SowingTable,
    Table,
    Text,
    Variable,
    Weather,
)


class RunFile(Table):
    """A run file with all defaults filled in: its tables, and the paths in them.

    `same_as` names another run file this one builds on.
    """

    title: Text
    same_as: Text | None = None
    seasons: Seasons
    weather: Weather
    air: Air = Air()
    places: Places = Places()
    crops: Annotated[list[CropEntry], Field(min_length=1)]
    model: Model = Model()
    maps: Maps = Maps()
    output: Output = Output()
    compute: Compute = Compute()

    _path: Path = PrivateAttr(default=Path("run.toml"))

    @property
    def path(self) -> Path:
        """The run file itself."""
        return self._path

    @property
    def base(self) -> Path:
        """The folder its paths are relative to."""
        return self._path.parent

    def resolve(self, path: str) -> Path:
        """Return a path of the run file as one that can be opened: relative ones start at the run file."""
        return self.base / path

    @property
    def output_folder(self) -> Path:
        """The folder for the results."""
        return self.resolve(self._folder_as_written)

    @property
    def _folder_as_written(self) -> str:
        return self.output.folder or f"results/{self._path.stem}"

    def co2(self, year: int) -> float:
        """Return the air's carbon dioxide in the season of a year [umol mol-1]."""
        return self.air.co2[f"{year:04}"] if isinstance(self.air.co2, dict) else self.air.co2

    def profiles(self) -> dict[str, CropProfile]:
        """Return the profile of each crop entry, with its changes, by the entry's name.

        Raises
        ------
        InputError
            With everything that is wrong with any of them.
        """
        profiles: dict[str, CropProfile] = {}
        faults: list[Fault] = []
        for entry in self.crops:
            try:
                profiles[entry.name] = _profile(entry, self._path)
            except InputError as error:
                faults += error.faults
        if faults:
            raise InputError(faults)
        return profiles

    def resolved(self) -> dict[str, Any]:
        """Return the run file with every default, as JSON can hold it.

        Paths are as written; of an absolute one only the last name is kept, so that results tell nothing of
        the machine they were made on.
        """
        plain: Raw = json.loads(self.model_dump_json())
        plain["output"]["folder"] = self._folder_as_written
        return changed_paths(plain, without_machine)


def load_runfile(path: str | Path) -> RunFile:
    """Read and check a run file. Weather, places and crop profiles are not opened yet.

    Parameters
    ----------
    path : str or Path
        A TOML file. Its paths are relative to it.

    Returns
    -------
    RunFile

    Raises
    ------
    InputError
        Missing file, not TOML, unknown key, wrong type, two crop entries of one name: all of them, and then
        also what is wrong with the crop profiles.
    """
    run, faults = read_runfile(path)
    if faults or run is None:
        raise InputError(faults)
    return run


def read_runfile(path: str | Path) -> tuple[RunFile | None, list[Fault]]:
    """Read a run file as far as it is right, so that what it names can be looked at in the same go.

    Parameters
    ----------
    path : str or Path
        A TOML file.

    Returns
    -------
    RunFile or None
        Without the tables and crop entries that are at fault, which have their defaults (`seasons.years`: none);
        None where the weather is, without which nothing else can be looked at.
    list of Fault
        What is wrong with it and with the crop profiles.

    Raises
    ------
    InputError
        Missing file or not TOML.
    """
    path = Path(path)
    layers = read_layers(path)
    raw = {"title": path.stem.replace("_", " ").replace("-", " ")} | merged(layers)

    def place(location: Location) -> str:
        return _place(location, raw, layers)

    spoilt = path_faults(raw, place)
    faults = [*spoilt.values(), *_doubled_names(raw, layers)]
    run: RunFile | None
    try:
        run = RunFile.model_validate(raw)
    except ValidationError as error:
        faults = [*faults_of(error, place, _keys_at, _TABLE_OF.get), *faults]
        run = _what_is_right(raw, list(spoilt))
    else:
        faults += _cross_faults(run, path.name)
        run = _what_is_right(raw, list(spoilt)) if spoilt else run
    if run is not None:
        run._path = path
    return run, [*faults, *_profile_faults(raw, path)] if faults else []


def _what_is_right(raw: Raw, spoilt: list[Location]) -> RunFile | None:
    """Return the tables and crop entries that have no fault, table by table; None without the weather."""
    found: dict[str, Any] = {}
    for name, table in _TABLES.items():
        try:
            found[name] = table.model_validate(raw.get(name, {}))
        except ValidationError:
            continue
        if any(location[0] == name for location in spoilt):
            del found[name]
    if "weather" not in found:
        return None
    no_seasons = Seasons.model_construct(years=[], through=None, allowed_missing=0.0)
    entries = raw.get("crops")
    crops = []
    for number, written in enumerate(entries if isinstance(entries, list) else []):
        try:
            entry = CropEntry.model_validate(written)
        except ValidationError:
            continue
        without_districts = isinstance(entry.sowing, SowingTable) and "places" not in found
        if not without_districts and ("crops", number) not in [location[:2] for location in spoilt]:
            crops.append(entry)
    title = raw["title"] if isinstance(raw["title"], str) else ""
    defaults = {name: table() for name, table in _TABLES.items() if name not in ("weather", "seasons")}
    return RunFile.model_construct(title=title, crops=crops, **({"seasons": no_seasons} | defaults | found))


_TABLES: dict[str, type[Table]] = {
    "seasons": Seasons,
    "weather": Weather,
    "air": Air,
    "places": Places,
    "model": Model,
    "maps": Maps,
    "output": Output,
    "compute": Compute,
}
_TABLE_OF = {key: f"[{name}]" for name, table in _TABLES.items() for key in table.model_fields} | dict.fromkeys(
    ("profile", "sowing", "area", "stages", "changes", "label"), "[[crops]]"
)


def _keys_at(location: Location) -> list[str]:
    """Return the keys that are right in the table at a location."""
    match location:
        case ():
            tables: tuple[type[Table], ...] = (RunFile,)
        case ("weather", "variables", _):
            tables = (Variable,)
        case ("places", "elevation"):
            tables = (Grid,)
        case ("crops", _):
            tables = (CropEntry,)
        case ("crops", _, "sowing"):
            tables = (SowingGrid, SowingTable)
        case ("crops", _, "area"):
            tables = (AreaGrid,)
        case ("crops", _, "changes", _):
            tables = (Change,)
        case (str(name), *_) if name in _TABLES:
            tables = (_TABLES[name],)
        case _:
            tables = ()
    return [key for table in tables for key in table.model_fields]


def _place(location: Location, raw: Raw, layers: list[Layer]) -> str:
    """Return how messages name a location: the file that holds it, the crop entry, the keys."""
    parts = list(location)
    heading: list[str] = []
    if len(parts) > 1 and parts[0] == "crops" and isinstance(parts[1], int):
        entry = raw["crops"][parts[1]]
        name = entry.get("name") if isinstance(entry, dict) else None
        heading = [f"crop {name}" if isinstance(name, str) else f"[[crops]] number {parts[1] + 1}"]
        shown = next((layer.shown for layer in layers if name in _crop_names(layer.raw)), layers[0].shown)
        parts = parts[2:]
    else:
        shown = next((layer.shown for layer in layers if _holds(layer.raw, parts)), layers[0].shown)
    keys = ".".join(str(part) for part in parts if isinstance(part, str))
    return ": ".join([shown, *heading, *([keys] if keys else [])])


def _holds(value: Any, parts: list[str | int]) -> bool:
    for part in parts:
        if not isinstance(value, dict):
            return True
        if part not in value:
            return False
        value = value[part]
    return True


def _crop_names(raw: Raw) -> list[Any]:
    entries = raw.get("crops")
    return (
        [entry.get("name") for entry in entries if isinstance(entry, dict)]
        if isinstance(entries, list)
        else []
    )


def _doubled_names(raw: Raw, layers: list[Layer]) -> list[Fault]:
    names = [name for name in _crop_names(raw) if isinstance(name, str)]
    lower = [name.lower() for name in names]
    doubled = dict.fromkeys(name for name in names if lower.count(name.lower()) > 1)
    faults = {
        name.lower(): Fault(
            f"there are {lower.count(name.lower())} crop entries named '{name}' (upper or lower case is no "
            "difference in file names)",
            f"{layers[0].shown}: crops",
            f"Give each entry a name of its own, for example '{name}-late', with profile = \"...\".",
        )
        for name in doubled
    }
    return list(faults.values())


def _cross_faults(run: RunFile, shown: str) -> list[Fault]:
    """Return what does not fit between tables that are each right by themselves."""
    faults = []
    if isinstance(run.air.co2, dict):
        missing = [f"{year:04}" for year in run.seasons.years if f"{year:04}" not in run.air.co2]
        if missing:
            remedy = f'Add "{missing[0]}" = ..., or give one number for all years.'
            faults.append(Fault(f"no value for {', '.join(missing)}", f"{shown}: air.co2", remedy))
    for entry in run.crops:
        if isinstance(entry.sowing, SowingTable) and run.places.districts is None:
            faults.append(
                Fault(
                    "sowing by district needs districts",
                    f"{shown}: crop {entry.name}: sowing",
                    'Add [places] districts = "FILE" and id_field = "FIELD".',
                )
            )
    return faults


def _profile(entry: CropEntry, path: Path) -> CropProfile:
    where = f"{path.name}: crop {entry.name}"
    chosen = str(path.parent / entry.profile) if is_profile_path(entry.profile) else entry.profile
    changes = {name: change.model_dump(exclude_none=True) for name, change in entry.changes.items()}
    try:
        profile = load_crop(chosen, changes, where=f"{where}: changes")
    except InputError as error:
        raise InputError(
            Fault(fault.what, f"{where}: profile", fault.remedy) if fault.where == "crop" else fault
            for fault in error.faults
        ) from None
    if entry.stages == "thermal_time" and profile.thermal_sums is None:
        raise InputError(
            [
                Fault(
                    f"the profile '{profile.name}' has no thermal sums",
                    f"{where}: stages",
                    'Use stages = "days", or give the four sums (initial_thermal_sum ...) as changes.',
                )
            ]
        )
    return profile


def _profile_faults(raw: Raw, path: Path) -> list[Fault]:
    """Return what is wrong with the profiles of those crop entries that are well formed themselves."""
    faults: list[Fault] = []
    entries = raw.get("crops")
    for entry in entries if isinstance(entries, list) else []:
        try:
            _profile(CropEntry.model_validate(entry), path)
        except ValidationError:
            continue
        except InputError as error:
            faults += error.faults
    return faults

"""A trained model as a folder that explains itself: `manifest.json`, `arrays.npz`, `calibration.json`, metrics and a card."""

from __future__ import annotations

import hashlib
import io
import json
import os
from dataclasses import dataclass, field
from functools import cached_property, lru_cache
from pathlib import Path

import numpy as np

from shiftpred.bundles.locations import find_models
from shiftpred.calibration.error_size import ErrorSize
from shiftpred.calibration.intervals import IntervalTable
from shiftpred.calibration.novelty import NoveltyTable
from shiftpred.errors import BundleError
from shiftpred.regression.environment_memory import EnvironmentMemory
from shiftpred.regression.environment_model import EnvironmentModel
from shiftpred.regression.substituent_model import SubstituentModel

__all__ = ["FORMAT", "ModelBundle", "load_bundle", "load_default_bundle", "save_bundle", "save_judgement"]

FORMAT = 2
"""Number of the folder format that is written."""
_READABLE = (1, 2)
"""Formats that are read; 1 had no memory of measured surroundings."""
_LARGEST_FILE = 64 * 1024 * 1024
_ARRAYS, _CALIBRATION, _SUBSTITUENTS = "arrays.npz", "calibration.json", "substituent_model.npz"
_CHECKED = (_ARRAYS, _CALIBRATION, _SUBSTITUENTS)


@dataclass(frozen=True)
class ModelBundle:
    """A loaded model."""

    folder: Path
    manifest: dict
    environment_model: EnvironmentModel
    memory: EnvironmentMemory
    error_size: ErrorSize
    intervals: IntervalTable
    novelty: NoveltyTable
    judgement: dict = field(default_factory=dict)
    """Parameters of the calibrated judgement; empty: built-in defaults."""

    @property
    def edition(self) -> str:
        """Name and edition, as reports print it."""
        return f"{self.manifest['name']} {self.manifest['edition']}"

    @cached_property
    def substituent_model(self) -> SubstituentModel:
        """The interpretable model; read only when an explanation is asked for."""
        arrays = _read_arrays(self.folder / _SUBSTITUENTS)
        meta = json.loads(bytes(arrays.pop("meta")).decode())
        return SubstituentModel.from_arrays(arrays, meta)


def save_bundle(
    folder: str | Path,
    *,
    name: str,
    edition: str,
    network_arrays: dict[str, np.ndarray],
    novelty_arrays: dict[str, np.ndarray],
    memory_arrays: dict[str, np.ndarray],
    calibration: dict,
    substituent_arrays: dict[str, np.ndarray],
    substituent_meta: dict,
    origin: dict,
    texts: dict[str, str] | None = None,
) -> Path:
    """Write a model folder; every file is written aside and renamed, the manifest last.

    Parameters
    ----------
    folder : path
    name, edition : str
    network_arrays, novelty_arrays, memory_arrays, substituent_arrays : dict of str to ndarray
        Plain numbers only. The network is stored in half precision: round its weights before anything is measured with it.
    calibration : dict
        JSON-ready: 'intervals' (see `IntervalTable`), 'error_size' (see `ErrorSize`) and, where it was fitted, 'judgement'.
    substituent_meta : dict
        JSON-ready.
    origin : dict
        JSON-ready: data with their SHA-256, settings, versions.
    texts : dict, optional
        Further files (metrics, card) by name.
    """
    folder = Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    small = {f"network/{k}": v.astype(np.float16) for k, v in network_arrays.items()}
    small |= {f"novelty/{k}": v for k, v in novelty_arrays.items()}
    small |= {f"memory/{k}": v for k, v in memory_arrays.items()}
    meta = np.frombuffer(json.dumps(substituent_meta).encode(), dtype=np.uint8)
    contents = {
        _ARRAYS: _pack(small),
        _SUBSTITUENTS: _pack({**substituent_arrays, "meta": meta}),
        _CALIBRATION: json.dumps(calibration, indent=1).encode(),
    }
    contents |= {k: v.encode() for k, v in (texts or {}).items()}
    for file, content in contents.items():
        _write(folder / file, content)
    manifest = dict(
        format=FORMAT, name=name, edition=edition, origin=origin,
        files={f: _describe(contents[f]) for f in _CHECKED},
    )
    _write(folder / "manifest.json", _render_manifest(manifest))
    return folder


def _describe(content: bytes) -> dict:
    return dict(sha256=hashlib.sha256(content).hexdigest(), bytes=len(content))


def _render_manifest(manifest: dict) -> bytes:
    return (json.dumps(manifest, indent=1) + "\n").encode()


def load_bundle(folder: str | Path) -> ModelBundle:
    """Read and check a model folder.

    Raises
    ------
    BundleError
        If a file is missing, too large, altered since it was written, or of another format.
    """
    folder = Path(folder)
    try:
        manifest = json.loads(_read_file(folder / "manifest.json"))
        found = manifest["format"]
        listed = {f: manifest["files"][f] for f in _CHECKED}
        manifest["name"], manifest["edition"]  # noqa: B018  (a manifest without them is refused below)
    except (ValueError, KeyError, TypeError) as error:
        raise BundleError(
            str(folder / "manifest.json"), f"a damaged manifest ({error!r})", "the manifest that `shiftpred train` wrote",
            "install shiftpred again, or train the model anew",
        ) from None
    if found not in _READABLE:
        raise BundleError(
            str(folder / "manifest.json"), f"model format {found!r}", f"format {' or '.join(map(str, _READABLE))}",
            "install the version of shiftpred that made this model" if isinstance(found, int) and found > FORMAT
            else "train the model anew with `shiftpred train`",
        )
    checked = {}
    for file, entry in listed.items():
        content = _read_file(folder / file)
        if hashlib.sha256(content).hexdigest() != entry.get("sha256"):
            raise BundleError(
                str(folder / file), "contents that do not match the manifest's SHA-256",
                "the file as it was written with the model", "copy the model folder again from where it came",
            )
        checked[file] = content
    arrays = _unpack(checked[_ARRAYS], folder / _ARRAYS)
    calibration = json.loads(checked[_CALIBRATION])

    def take(part: str) -> dict[str, np.ndarray]:
        return {k.removeprefix(part): v for k, v in arrays.items() if k.startswith(part)}

    return ModelBundle(
        folder, manifest,
        EnvironmentModel(take("network/")), EnvironmentMemory(take("memory/")), ErrorSize(calibration.get("error_size")),
        IntervalTable(calibration["intervals"]), NoveltyTable(**take("novelty/")), calibration.get("judgement", {}),
    )


def save_judgement(parameters: dict, folder: str | Path) -> None:
    """Put judgement parameters into a model folder's calibration file and renew its check sum in the manifest.

    Raises
    ------
    BundleError
        As `load_bundle`.
    """
    bundle = load_bundle(folder)
    calibration = json.loads(_read_file(bundle.folder / _CALIBRATION)) | dict(judgement=parameters)
    content = json.dumps(calibration, indent=1).encode()
    files = bundle.manifest["files"] | {_CALIBRATION: _describe(content)}
    _write(bundle.folder / _CALIBRATION, content)
    _write(bundle.folder / "manifest.json", _render_manifest(bundle.manifest | dict(files=files)))


@lru_cache(maxsize=1)
def load_default_bundle() -> ModelBundle:
    """Read the model that is shipped with the package, or the one that SHIFTPRED_MODEL names."""
    named = os.environ.get("SHIFTPRED_MODEL")
    if named:
        return load_bundle(named)
    candidates = sorted(p.parent for p in find_models().glob("*/manifest.json"))
    if not candidates:
        raise BundleError(
            str(find_models()), "no model", "a folder with manifest.json",
            "reinstall shiftpred, or set SHIFTPRED_MODEL to the folder of a trained model",
        )
    return load_bundle(candidates[-1])


def _read_file(path: Path) -> bytes:
    try:
        size = path.stat().st_size
        if size > _LARGEST_FILE:
            raise BundleError(
                str(path), f"{size:,} bytes", f"at most {_LARGEST_FILE:,} bytes", "copy the model folder again"
            )
        return path.read_bytes()
    except OSError as error:
        if isinstance(error, BundleError):
            raise
        raise BundleError(
            str(path), f"no readable file ({error.strerror})", "a complete model folder",
            "copy the model folder again from where it came, or reinstall shiftpred",
        ) from None


def _read_arrays(path: Path) -> dict[str, np.ndarray]:
    return _unpack(_read_file(path), path)


def _unpack(content: bytes, path: Path) -> dict[str, np.ndarray]:
    try:
        with np.load(io.BytesIO(content), allow_pickle=False) as archive:
            return {k: archive[k] for k in archive.files}
    except (ValueError, OSError, KeyError) as error:
        raise BundleError(
            str(path), f"arrays that cannot be read ({error})", "plain numpy arrays", "copy the model folder again"
        ) from None


def _pack(arrays: dict[str, np.ndarray]) -> bytes:
    buffer = io.BytesIO()
    np.savez_compressed(buffer, **arrays)
    return buffer.getvalue()


def _write(path: Path, content: bytes) -> None:
    temporary = path.with_name(path.name + ".tmp")
    with open(temporary, "wb") as handle:
        handle.write(content)
        handle.flush()
        os.fsync(handle.fileno())
    os.replace(temporary, path)

"""A trained model as a folder that explains itself: `manifest.json`, `arrays.npz`, `calibration.json`, metrics and a card."""

from __future__ import annotations

import hashlib
import io
import json
import math
import os
import stat
import zipfile
import zlib
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from functools import cached_property, lru_cache
from pathlib import Path

import numpy as np

from shiftpred.bundles.locations import find_models
from shiftpred.calibration.error_size import ErrorSize
from shiftpred.calibration.intervals import IntervalTable
from shiftpred.calibration.novelty import NoveltyTable
from shiftpred.errors import BundleError
from shiftpred.records import NUCLEI
from shiftpred.regression.environment_memory import EnvironmentMemory
from shiftpred.regression.environment_model import EnvironmentModel
from shiftpred.regression.substituent_model import SubstituentModel

__all__ = ["FORMAT", "ModelBundle", "load_bundle", "load_default_bundle", "save_bundle", "save_judgement"]

FORMAT = 2
"""Number of the folder format that is written."""
_READABLE = (1, 2)
"""Formats that are read; 1 had no memory of measured surroundings."""
_LARGEST_FILE = 64 * 1024 * 1024
_LARGEST_UNPACKED = 256 * 1024 * 1024
"""Bytes of all arrays of one file together; a compressed file says itself how many there are."""
_MOST_ARRAYS = 10_000
_ARRAYS, _CALIBRATION, _SUBSTITUENTS = "arrays.npz", "calibration.json", "substituent_model.npz"
_CHECKED = (_ARRAYS, _CALIBRATION, _SUBSTITUENTS)
_ASIDE = ".tmp"


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
        content = _read_checked(self.folder, _SUBSTITUENTS, self.manifest["files"][_SUBSTITUENTS])
        arrays = _unpack(content, self.folder / _SUBSTITUENTS)
        with _refusing_odd_contents(self.folder / _SUBSTITUENTS):
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
    """Write a model folder; whenever it is interrupted, the folder holds the old model or the new one (see `_store`).

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

    Raises
    ------
    BundleError
        If the folder cannot be written to or the disk is full; an older model in it is left as it was.
    """
    folder = Path(folder)
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
    manifest = dict(
        format=FORMAT, name=name, edition=edition, origin=origin,
        files={f: _describe(contents[f]) for f in _CHECKED},
    )
    _store(folder, contents, manifest)
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
        if not all(isinstance(text, str) for text in (manifest["name"], manifest["edition"], *(e["sha256"] for e in listed.values()))):
            raise TypeError("name, edition and check sums are texts")
    except (ValueError, KeyError, TypeError, RecursionError) as error:
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
    checked = {file: _read_checked(folder, file, entry) for file, entry in listed.items()}
    arrays = _unpack(checked[_ARRAYS], folder / _ARRAYS)

    def take(part: str) -> dict[str, np.ndarray]:
        return {k.removeprefix(part): v for k, v in arrays.items() if k.startswith(part)}

    with _refusing_odd_contents(folder):
        calibration = json.loads(checked[_CALIBRATION])
        for nucleus in NUCLEI:
            calibration["intervals"][nucleus]["classes"].items()
        return ModelBundle(
            folder, manifest,
            EnvironmentModel(take("network/")), EnvironmentMemory(take("memory/")), ErrorSize(calibration.get("error_size")),
            IntervalTable(calibration["intervals"]), NoveltyTable(**take("novelty/")), dict(calibration.get("judgement", {})),
        )


def save_judgement(parameters: dict, folder: str | Path) -> None:
    """Put judgement parameters into a model folder's calibration file and renew its check sum in the manifest.

    Raises
    ------
    BundleError
        As `load_bundle`.
    """
    bundle = load_bundle(folder)
    files = bundle.manifest["files"]
    calibration = json.loads(_read_checked(bundle.folder, _CALIBRATION, files[_CALIBRATION])) | dict(judgement=parameters)
    content = json.dumps(calibration, indent=1).encode()
    _store(bundle.folder, {_CALIBRATION: content}, bundle.manifest | dict(files=files | {_CALIBRATION: _describe(content)}))


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
        found = path.stat()
        if not stat.S_ISREG(found.st_mode):
            raise BundleError(str(path), "no ordinary file", "a complete model folder", "copy the model folder again")
        if found.st_size > _LARGEST_FILE:
            raise BundleError(
                str(path), f"{found.st_size:,} bytes", f"at most {_LARGEST_FILE:,} bytes", "copy the model folder again"
            )
        return path.read_bytes()
    except (OSError, ValueError) as error:  # ValueError: a null character in the path
        if isinstance(error, BundleError):
            raise
        raise BundleError(
            str(path), f"no readable file ({getattr(error, 'strerror', None) or error})", "a complete model folder",
            "copy the model folder again from where it came, or reinstall shiftpred",
        ) from None


def _read_checked(folder: Path, file: str, entry: dict) -> bytes:
    """Return a file's content if it is the one that the manifest lists; an interrupted save may have left it under its
    temporary name."""
    waiting = folder / (file + _ASIDE)
    try:
        content = _read_file(folder / file)
    except BundleError:
        if not waiting.is_file():
            raise
        content = b""
    if _is_listed(content, entry):
        return content
    if waiting.is_file() and _is_listed(content := _read_file(waiting), entry):
        return content
    raise BundleError(
        str(folder / file), "contents that do not match the manifest's SHA-256",
        "the file as it was written with the model", "copy the model folder again from where it came",
    )


def _is_listed(content: bytes, entry: dict) -> bool:
    return hashlib.sha256(content).hexdigest() == entry["sha256"]


@contextmanager
def _refusing_odd_contents(where: Path) -> Iterator[None]:
    """Turn whatever a part of the model stumbles over into a refusal."""
    try:
        yield
    except (AttributeError, IndexError, KeyError, RecursionError, TypeError, ValueError) as error:
        raise BundleError(
            str(where), f"contents that do not belong to a model ({error!r})", "what `shiftpred train` wrote",
            "copy the model folder again from where it came, or train the model anew",
        ) from None


def _unpack(content: bytes, path: Path) -> dict[str, np.ndarray]:
    try:
        with zipfile.ZipFile(io.BytesIO(content)) as archive:
            _require_sizes(archive)
        with np.load(io.BytesIO(content), allow_pickle=False) as archive:
            return {k: archive[k] for k in archive.files}
    except (ValueError, OSError, KeyError, EOFError, RuntimeError, MemoryError, zipfile.BadZipFile, zlib.error) as error:
        raise BundleError(
            str(path), f"arrays that cannot be read ({error})", "plain numpy arrays", "copy the model folder again"
        ) from None


def _require_sizes(archive: zipfile.ZipFile) -> None:
    """Refuse, before anything is unpacked, what is too large or says so only inside; raises ValueError."""
    members = archive.infolist()
    total = sum(m.file_size for m in members)
    if total > _LARGEST_UNPACKED or len(members) > _MOST_ARRAYS:
        raise ValueError(f"{len(members)} arrays of {total:,} bytes, more than {_LARGEST_UNPACKED:,}")
    for member in members:
        with archive.open(member) as stream:
            version = np.lib.format.read_magic(stream)
            read = np.lib.format.read_array_header_1_0 if version == (1, 0) else np.lib.format.read_array_header_2_0
            shape, _, dtype = read(stream)
            if dtype.kind not in "biuf":
                raise ValueError(f"{member.filename} of type {dtype}")
            if stream.tell() + math.prod(shape) * dtype.itemsize != member.file_size:
                raise ValueError(f"{member.filename} of {member.file_size:,} bytes for shape {shape}")


def _pack(arrays: dict[str, np.ndarray]) -> bytes:
    buffer = io.BytesIO()
    np.savez_compressed(buffer, **arrays)
    return buffer.getvalue()


def _store(folder: Path, contents: dict[str, bytes], manifest: dict) -> None:
    """Replace files of a model folder so that it holds the old model or the new one at any moment.

    All contents are written aside first; renaming the manifest is what makes them count, because `_read_checked` finds the
    files that it lists under either name; then they get their own names.
    """
    try:
        folder.mkdir(parents=True, exist_ok=True)
        _finish_interrupted(folder)
        written = [_write_aside(folder / file, content) for file, content in contents.items()]
        _write_aside(folder / "manifest.json", _render_manifest(manifest))
        _sync_folder(folder)
        for path in (folder / "manifest.json", *written):
            os.replace(path.with_name(path.name + _ASIDE), path)
        _sync_folder(folder)
    except (OSError, ValueError) as error:
        if isinstance(error, BundleError):
            raise
        raise BundleError(
            str(folder), f"a place that cannot be written to ({getattr(error, 'strerror', None) or error})",
            "a folder with write permission and room for the model", "another folder with --output, or make room on the disk",
        ) from error


def _finish_interrupted(folder: Path) -> None:
    """Give files that the present manifest lists their own names, where a save was interrupted before it could."""
    try:
        files = json.loads(_read_file(folder / "manifest.json"))["files"]
        listed = {file: files[file] for file in _CHECKED}
        waiting = [f for f in listed if (folder / (f + _ASIDE)).is_file()]
        ready = [f for f in waiting if _is_listed(_read_file(folder / (f + _ASIDE)), listed[f])]
    except (BundleError, ValueError, KeyError, TypeError):
        return  # no model here, or a damaged one: nothing to keep
    for file in ready:
        os.replace(folder / (file + _ASIDE), folder / file)


def _write_aside(path: Path, content: bytes) -> Path:
    with open(path.with_name(path.name + _ASIDE), "wb") as handle:
        handle.write(content)
        handle.flush()
        os.fsync(handle.fileno())
    return path


def _sync_folder(folder: Path) -> None:
    """Make the new names last through a power cut, where the system can."""
    if hasattr(os, "O_DIRECTORY"):
        handle = os.open(folder, os.O_RDONLY | os.O_DIRECTORY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)

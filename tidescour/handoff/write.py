"""Write a result folder whole or not at all, and never over a file that is not ours.

The new folder is built beside the old one under the name ``<name>.tidescour-unfinished``; then the old one is renamed
to ``<name>.tidescour-previous``, the new one to its name, and the previous one removed. So after a kill at any moment

- an ``unfinished`` folder is rubbish, always;
- a ``previous`` folder is whole, always: the earlier results, where the folder itself is missing.

`recover_results` puts this right; every write begins and ends with it, and so may a reader. No call swaps two folders
in one step on every system, so the moment without the folder, between two renames, can only be recovered from.
"""

from __future__ import annotations

import hashlib
import json
import os
import shutil
from collections.abc import Iterator, Mapping
from pathlib import Path, PurePosixPath
from typing import Any

from tidescour.errors import HandoffError
from tidescour.handoff.encode import json_bytes

PROVENANCE = "provenance.json"
UNFINISHED = ".tidescour-unfinished"
PREVIOUS = ".tidescour-previous"


def write_results(folder: Path, files: Mapping[str, bytes], command: str, provenance: Mapping[str, Any]) -> None:
    """Replace a result folder whole, or leave it as it was.

    Parameters
    ----------
    folder : Path
        Where the results go; made where it does not exist.
    files : mapping of str to bytes
        Contents by name, with ``/`` before a name in a subfolder.
    command : str
        The command that writes, such as ``run``; only its own results are replaced.
    provenance : mapping
        What `provenance.json` holds beside the command and the manifest, ready for JSON.

    Raises
    ------
    HandoffError
        If something in the folder was not written by the same command, or was changed since, or if the system refuses,
        as for a folder locked by another program; what was there stands.
    """
    target = _real(folder)
    contents = {**files, PROVENANCE: _provenance_bytes(files, command, provenance)}
    try:
        target.parent.mkdir(parents=True, exist_ok=True)
        _recover(target)
        try:
            _write_tree(_beside(target, UNFINISHED), contents)
            _check_replaceable(target, command)
            _swap(target)
        except BaseException:
            _recover(target)
            raise
    except OSError as problem:
        raise _refused_by_system(target, problem) from problem
    _tidy_up(target)


def check_replaceable(folder: Path, command: str) -> None:
    """Refuse a folder that `write_results` would refuse; worth calling before a long computation.

    Raises
    ------
    HandoffError
        If the folder is a file, or holds anything that the same command did not write, or that was changed since, or
        cannot be read.
    """
    target = _real(folder)
    try:
        _check_replaceable(target, command)
    except OSError as problem:
        raise _refused_by_system(target, problem) from problem


def _check_replaceable(target: Path, command: str) -> None:
    if not target.exists():
        return
    if not target.is_dir():
        raise HandoffError(f"{target} is a file: give a folder for the results")
    if not any(target.iterdir()):
        return
    manifest, writer = _read_manifest(target)
    _refuse_foreign(target, manifest)
    if writer != command:
        raise HandoffError(
            f"{target} holds results of `tidescour {writer}`, and this is `tidescour {command}`: "
            "give another folder with --out, or remove this one"
        )


def recover_results(folder: Path) -> None:
    """Put right what a killed write left beside a folder; do nothing where there is nothing to put right.

    Raises
    ------
    HandoffError
        If the earlier results that would be removed hold a file that is not ours, or if the system refuses.
    """
    target = _real(folder)
    try:
        _recover(target)
    except OSError as problem:
        raise _refused_by_system(target, problem) from problem


def _recover(target: Path) -> None:
    unfinished, previous = _beside(target, UNFINISHED), _beside(target, PREVIOUS)
    if previous.exists() and _missing_or_empty(target):
        if target.exists():
            os.rmdir(target)
        os.rename(previous, target)
    if unfinished.exists():
        shutil.rmtree(unfinished)
    if previous.exists() and (target / PROVENANCE).is_file():
        if any(previous.iterdir()):
            _refuse_foreign(previous, _read_manifest(previous)[0])
        os.rename(previous, unfinished)
        shutil.rmtree(unfinished)


def _real(folder: Path) -> Path:
    # A link to a folder is followed, so that the folder is replaced and not the link.
    return Path(os.path.realpath(folder))


def _beside(target: Path, ending: str) -> Path:
    return target.with_name(target.name + ending)


def _missing_or_empty(folder: Path) -> bool:
    return not folder.exists() or (folder.is_dir() and not any(folder.iterdir()))


def _provenance_bytes(files: Mapping[str, bytes], command: str, provenance: Mapping[str, Any]) -> bytes:
    for name in files:
        path = PurePosixPath(name)
        if path.is_absolute() or ".." in path.parts or "\\" in name or str(path) != name or name == PROVENANCE:
            raise ValueError(f"{name!r} cannot be the name of a result file")
    manifest = [{"name": name, "sha256": hashlib.sha256(files[name]).hexdigest()} for name in sorted(files)]
    document = {"command": command, **provenance, "files": manifest}
    return json_bytes(document)


def _read_manifest(folder: Path) -> tuple[dict[str, str], str]:
    """Return name and SHA-256 of the files that the folder should hold, and the command that wrote them."""
    try:
        document = json.loads((folder / PROVENANCE).read_bytes())
        return {str(file["name"]): str(file["sha256"]) for file in document["files"]}, str(document["command"])
    except FileNotFoundError:
        first = next(_names(folder), "a folder")
        raise HandoffError(
            f"{folder} holds {first} and no {PROVENANCE}, so it is not a result folder: give another one with --out"
        ) from None
    except (ValueError, TypeError, KeyError) as problem:
        raise HandoffError(
            f"{folder / PROVENANCE} does not list the files of the folder ({problem}): "
            "give another folder with --out, or remove this one"
        ) from problem


def _names(folder: Path) -> Iterator[str]:
    """Yield the names of all files under a folder, in order; a link to a folder counts as a file."""
    for parent, folders, files in os.walk(folder, onerror=_raise):
        folders.sort()
        links = [name for name in folders if os.path.islink(os.path.join(parent, name))]
        for name in sorted(files + links):
            yield (Path(parent) / name).relative_to(folder).as_posix()


def _raise(problem: OSError) -> None:
    raise problem


def _refuse_foreign(folder: Path, manifest: Mapping[str, str]) -> None:
    for name in _names(folder):
        if name == PROVENANCE:
            continue
        if name not in manifest or not _is_plain_file(folder / name):
            raise HandoffError(
                f"{folder} holds {name}, which tidescour did not write: move it away, or give another folder with --out"
            )
        if hashlib.sha256((folder / name).read_bytes()).hexdigest() != manifest[name]:
            raise HandoffError(
                f"{folder}: {name} was changed after tidescour wrote it: "
                "move it away to keep the change, or give another folder with --out"
            )


def _is_plain_file(path: Path) -> bool:
    return path.is_file() and not path.is_symlink()


def _write_tree(folder: Path, contents: Mapping[str, bytes]) -> None:
    os.mkdir(folder)
    for name in sorted(contents):
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        with open(path, "xb") as stream:
            stream.write(contents[name])
            stream.flush()
            os.fsync(stream.fileno())
    for subfolder in sorted({(folder / name).parent for name in contents}):
        _sync_folder(subfolder)


def _swap(target: Path) -> None:
    if target.exists():
        os.rename(target, _beside(target, PREVIOUS))
    os.rename(_beside(target, UNFINISHED), target)


def _sync_folder(folder: Path) -> None:
    # Names in a folder are made to last through the folder itself; Windows has no such call and needs none.
    if os.name != "posix":
        return
    descriptor = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)


def _tidy_up(target: Path) -> None:
    """Remove the previous results; where the system refuses for now, the next write does it."""
    try:
        _sync_folder(target.parent)
        _recover(target)
    except OSError:
        return


def _refused_by_system(target: Path, problem: OSError) -> HandoffError:
    previous = _beside(target, PREVIOUS)
    stands = (
        f"the earlier results are whole in {previous}: rename it back, or run again"
        if previous.exists() and not target.exists()
        else "what was there before stands as it was"
    )
    return HandoffError(
        f"{target} cannot be written: {problem}; {stands}. "
        "If another program has the folder or a file in it open, close it there and run again"
    )

"""A recording on its way to the disk, from a thread of its own."""

from __future__ import annotations

import errno
import os
import threading
from contextlib import suppress
from dataclasses import dataclass, replace
from pathlib import Path
from queue import SimpleQueue

from fieldkit.capture.clock import now_s
from fieldkit.capture.sidecar import Gap, RecordingInfo, read_info, sidecar_path, write_info
from fieldkit.capture.source import Block
from fieldkit.capture.wav_file import WavFile
from fieldkit.errors import InputError, Place
from fieldkit.signal.audio_file import MAX_SAMPLES

SYNC_EVERY_S = 1.0
MOST_WAITING_S = 20.0
"""So much may wait for a slow disk; beyond it frames are lost, and marked."""
_NO_SPACE = (errno.ENOSPC, errno.EDQUOT, errno.EFBIG)


@dataclass(frozen=True, slots=True)
class _Aside:
    """A wish about the blow at a frame, counted as the blocks are."""

    frame: int
    aside: bool


class RecordingWriter:
    """Frames to a WAV file and what is known about them to its sidecar.

    ``feed`` never waits. Every frame is readable as soon as it is written, and the disk is
    synchronised every SYNC_EVERY_S. A file as long as can be read back is followed by another part.
    """

    def __init__(
        self,
        path: Path,
        info: RecordingInfo,
        *,
        most_frames: int | None = None,
        part_frames: int | None = None,
        waiting_s: float = MOST_WAITING_S,
    ) -> None:
        """Create the files; raises InputError where they cannot be, or are there already."""
        self.paths: tuple[Path, ...] = (path,)
        self.failure = ""
        """Why it ended before it was closed, as a sentence."""
        self.frames_written = 0
        self.gaps = 0
        """In all parts."""
        self.trouble = ""
        """What could not be noted beside the samples, as a sentence; they are safe."""
        self._most_frames = most_frames
        self._part_frames = part_frames or MAX_SAMPLES // len(info.channels)
        self._most_waiting = round(waiting_s * info.rate_hz)
        self._fed = self._taken = 0
        self._dropped = 0
        self._queue: SimpleQueue[Block | _Aside | str] = SimpleQueue()
        self._offsets: list[tuple[int, int]] = []
        self._info = info
        self._file = self._create(path, info)
        self._synced_s = now_s()
        self._thread = threading.Thread(target=self._run, name="recording", daemon=True)
        self._thread.start()

    @property
    def finished(self) -> bool:
        """Whether nothing more will be written: it has its length, or failed."""
        full = self._most_frames is not None and self.frames_written >= self._most_frames
        return full or bool(self.failure)

    @property
    def info(self) -> RecordingInfo:
        """What the sidecar of the last part tells."""
        return self._info

    def feed(self, block: Block) -> None:
        """Take a block; never waits."""
        if self._fed - self._taken + len(block.samples) > self._most_waiting:
            self._dropped += len(block.samples) + (block.lost_frames or 0)
            return
        if self._dropped:
            lost = self._dropped + (block.lost_frames or 0)
            block = replace(block, lost_frames=lost, cause="the disk was too slow")
            self._dropped = 0
        self._fed += len(block.samples)
        self._queue.put(block)

    def set_aside(self, frame: int, aside: bool) -> None:
        """Mark the blow at a frame, counted as the blocks are, or take the mark away."""
        if self._thread.is_alive():
            self._queue.put(_Aside(frame, aside))
        else:
            self._note_aside(_Aside(frame, aside))

    def close(self, ended: str, *, within_s: float = 30.0) -> None:
        """Write what waits, note why the recording ended, close; waits for the disk."""
        self._queue.put(ended)
        self._thread.join(within_s)

    def _run(self) -> None:
        while not isinstance(item := self._queue.get(), str):
            if isinstance(item, _Aside):
                self._note_aside(item)
                continue
            self._taken += len(item.samples)
            if not self.finished:
                self._guarded(item)
        self._finish(item)

    def _guarded(self, block: Block) -> None:
        try:
            self._write(block)
        except Exception as error:
            self._fail(error)

    def _write(self, block: Block) -> None:
        if self._file.frames >= self._part_frames:
            self._next_part()
        offset = block.first_frame - self.frames_written
        if not self._offsets or self._offsets[-1][1] != offset:
            self._offsets.append((block.first_frame, offset))
        if block.lost_frames != 0 and self.frames_written:
            self._mark(block)
        samples = block.samples
        if self._most_frames is not None:
            samples = samples[: self._most_frames - self.frames_written]
        while len(samples):
            room = self._part_frames - self._file.frames
            if room <= 0:
                self._next_part()
                continue
            self._file.append(samples[:room])
            self.frames_written += len(samples[:room])
            samples = samples[room:]
        if now_s() - self._synced_s > SYNC_EVERY_S:
            os.fsync(self._file.fileno())
            self._synced_s = now_s()

    def _mark(self, block: Block) -> None:
        frame = self._file.frames
        earliest = max(0, frame - block.within_frames) if block.within_frames else None
        gap = Gap(frame, block.lost_frames, block.cause, block.exact, earliest)
        self._info = self._info.with_gap(gap)
        write_info(self.paths[-1], self._info)
        self.gaps += 1

    def _note_aside(self, wish: _Aside) -> None:
        offsets = [offset for first, offset in self._offsets if first <= wish.frame]
        if not offsets:
            return
        part, frame = divmod(wish.frame - offsets[-1], self._part_frames)
        try:
            if part == len(self.paths) - 1:
                self._info = self._info.with_set_aside(frame, wish.aside)
                write_info(self.paths[-1], self._info)
            elif (info := read_info(self.paths[part])) is not None:
                write_info(self.paths[part], info.with_set_aside(frame, wish.aside))
        except (OSError, InputError) as error:
            self.trouble = f"the mark of a blow could not be written ({error})"

    def _next_part(self) -> None:
        first, last = self.paths[0], self.paths[-1]
        path = first.with_stem(f"{first.stem}-part{len(self.paths) + 1}")
        following = replace(self._info, gaps=(), set_aside=(), continues=last.name)
        file = WavFile(path, rate_hz=following.rate_hz, channels=len(following.channels))
        write_info(path, following)
        done, self._file = self._file, file
        self.paths = (*self.paths, path)
        done.close()
        write_info(last, replace(self._info, ended=f"goes on in {path.name}"))
        self._info = following

    def _fail(self, error: Exception) -> None:
        file, seconds = self.paths[-1].name, self.frames_written / self._info.rate_hz
        full = isinstance(error, OSError) and error.errno in _NO_SPACE
        why = "the disk is full" if full else f"it could not be written ({error})"
        self.failure = f"{why}: the recording ended after {seconds:.1f} s, all of it is in {file}"

    def _finish(self, ended: str) -> None:
        self._info = replace(self._info, ended=self.failure or ended)
        try:
            self._file.close()
            write_info(self.paths[-1], self._info)
        except OSError as error:
            if not self.failure:
                self._fail(error)

    @staticmethod
    def _create(path: Path, info: RecordingInfo) -> WavFile:
        if path.suffix.lower() != ".wav":
            raise InputError(
                "recordings are written as WAV, which stays readable whatever happens",
                f"name it {path.with_suffix('.wav').name}",
                Place(path),
            )
        if sidecar_path(path).exists():
            raise _there_already(sidecar_path(path))
        try:
            file = WavFile(path, rate_hz=info.rate_hz, channels=len(info.channels))
        except FileExistsError:
            raise _there_already(path) from None
        except OSError as error:
            raise _not_written(path, error) from None
        try:
            write_info(path, info)
        except OSError as error:
            with suppress(OSError):
                file.close()
                path.unlink()
            raise _not_written(path, error) from None
        return file


def _there_already(path: Path) -> InputError:
    return InputError(
        "it is there already, and no recording is ever overwritten", "name another", Place(path)
    )


def _not_written(path: Path, error: OSError) -> InputError:
    reason = (error.strerror or str(error)).lower()
    return InputError(
        f"it cannot be written ({reason})", "name another folder, or free the disk", Place(path)
    )

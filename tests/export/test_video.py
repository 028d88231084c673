"""Videos: time, size and colour as another decoder reads them."""

import subprocess
import sys

import numpy as np
import pytest

from tests.stage.channel import picture
from viewer.errors import Cancelled, ExportError
from viewer.export import image, save_mp4, video
from viewer.export.frames import phase_of
from viewer.jobs import Progress
from viewer.scene.tokens import THEMES, rgb

ffmpeg = pytest.importorskip("imageio_ffmpeg")


def frames_of(path):
    """What the file says of itself, and its frames as RGB."""
    exact = "scale=in_color_matrix=bt709:flags=accurate_rnd+full_chroma_int"
    reader = ffmpeg.read_frames(str(path), pix_fmt="rgb24", output_params=["-vf", exact])
    meta = next(reader)
    width, height = meta["size"]
    return meta, [np.frombuffer(frame, np.uint8).reshape(height, width, 3) for frame in reader]


@pytest.fixture(scope="module")
def clip(tmp_path_factory):
    return save_mp4(picture(width=470, height=360), tmp_path_factory.mktemp("clip") / "clip.mp4")


def test_four_cycles_of_1_6_s_at_25_frames_a_second(clip):
    meta, frames = frames_of(clip)
    assert meta["codec"] == "h264"
    assert meta["pix_fmt"].startswith("yuv420p(tv, bt709, ")  # nothing left for players to guess
    assert meta["fps"] == 25
    assert len(frames) == 160
    assert meta["duration"] == pytest.approx(6.4, abs=0.011)


def test_sizes_are_padded_never_rescaled(clip):
    meta, frames = frames_of(clip)
    assert meta["size"] == (480, 368)
    drawn = image(picture(width=470, height=360), phase_of(3)).astype(int)
    assert np.abs(frames[3][:360, :470] - drawn).mean() < 2.0
    ground = np.round(255 * np.array(rgb(THEMES["light"].background)))
    band = np.round(255 * np.array(rgb(THEMES["light"].band)))
    assert np.abs(frames[3][5:200, 472:] - ground).max() <= 2
    assert np.abs(frames[3][362:] - band).max() <= 2


def test_frames_show_their_phase_and_colours_are_right(clip):
    _, frames = frames_of(clip)
    drawn = {k: image(picture(width=470, height=360), phase_of(k)).astype(int) for k in (0, 10, 20)}
    for k, truth in drawn.items():
        errors = {n: np.abs(frames[n][:360, :470] - truth).mean() for n in drawn}
        assert min(errors, key=errors.get) == k
        assert np.abs(frames[k + 120][:360, :470] - truth).mean() < 2.0  # the last cycle too


def test_padding_repeats_the_edge():
    small = np.arange(2 * 3 * 3, dtype=np.uint8).reshape(2, 3, 3)
    assert video.padded(small).shape == (16, 16, 3)
    assert (video.padded(small)[9, 12] == small[-1, -1]).all()
    assert video.padded(np.zeros((32, 48, 3), np.uint8)).shape == (32, 48, 3)


@pytest.mark.parametrize("when", [3, 22])  # while drawing, while encoding
def test_a_cancelled_video_leaves_nothing(tmp_path, when):
    ticks = []
    sink = Progress(show=lambda *tick: ticks.append(tick), stop=lambda: len(ticks) >= when)
    with pytest.raises(Cancelled):
        save_mp4(picture(width=320, height=240), tmp_path / "clip.mp4", sink)
    assert not list(tmp_path.iterdir())


def test_a_broken_encoder_is_one_clear_error(tmp_path, monkeypatch):
    monkeypatch.setattr(video, "_ENCODING", ("-crf", "many"))
    with pytest.raises(ExportError, match=r"clip\.mp4.*cannot be encoded"):
        save_mp4(picture(width=320, height=240), tmp_path / "clip.mp4")
    assert not list(tmp_path.iterdir())


def test_without_the_encoder_the_error_says_what_to_install(tmp_path):
    code = (
        "import sys; sys.modules['imageio_ffmpeg'] = None\n"
        "from viewer.export.video import save_mp4\nfrom viewer.errors import ExportError\n"
        "try: save_mp4(None, sys.argv[1])\nexcept ExportError as error: print(error)"
    )
    run = subprocess.run([sys.executable, "-c", code, str(tmp_path / "a.mp4")], capture_output=True, text=True)
    assert "hingelight[video]" in run.stdout
    assert not list(tmp_path.iterdir())

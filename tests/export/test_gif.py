"""Loops: frames, timing, palette."""

import numpy as np
import pytest
from PIL import Image

from tests.stage.channel import body, channel, nod, picture
from viewer.errors import Cancelled
from viewer.export import image, save_gif
from viewer.export.frames import drawings, phase_of, source_frames
from viewer.export.gif_loop import duration, write_loop
from viewer.export.shared_palette import SharedPalette
from viewer.jobs import Progress
from viewer.scene.palette import to_oklab
from viewer.scene.picture import Body
from viewer.scene.tokens import THEMES, rgb


def travelling():
    mesh = channel()
    return body(mesh, shape=nod(mesh) + 1j * nod(mesh, twist=1.0)[:, [2, 0, 1]])


def frames_of(path):
    """Every shown image with the time at which it goes, ms."""
    shown, clock = [], 0
    with Image.open(path) as loop:
        for number in range(loop.n_frames):
            loop.seek(number)
            clock += loop.info["duration"]
            shown.append((clock, np.asarray(loop.convert("RGB"))))
    return shown


def test_a_standing_mode_needs_21_drawings_a_travelling_one_40():
    assert len(set(source_frames(picture()))) == 21
    assert len(set(source_frames(picture(travelling())))) == 40
    for frame, source in enumerate(source_frames(picture())):
        assert np.cos(phase_of(frame)) == pytest.approx(np.cos(phase_of(source)), abs=1e-12)


def test_tasters_are_drawn_first_and_nothing_twice():
    seen = []
    order = [frame for frame, _ in drawings(picture(), lambda phase: seen.append(phase), first=(10, 0, 10))]
    assert order[:2] == [10, 0]
    assert sorted(order) == list(range(21))
    assert seen == [phase_of(frame) for frame in order]


@pytest.fixture(scope="module")
def loop(tmp_path_factory):
    return save_gif(picture(), tmp_path_factory.mktemp("loop") / "loop.gif")


def test_one_cycle_of_40_frames_of_40_ms_for_ever(loop):
    shown = frames_of(loop)
    assert [clock for clock, _ in shown] == list(range(40, 1601, 40))
    with Image.open(loop) as held:
        assert held.info["loop"] == 0
        assert held.size == (480, 360)


def test_frames_show_their_phase(loop):
    shown = frames_of(loop)
    for frame in (0, 7, 20, 33):
        error = np.abs(shown[frame][1].astype(int) - image(picture(), phase_of(frame))).max(axis=2)
        assert np.percentile(error, 99.9) <= 8  # 256 colours for everything
        assert error.mean() < 1.0
    assert np.array_equal(shown[7][1], shown[33][1])


def test_resting_pixels_rest(loop):
    first, *others = [pixels for _, pixels in frames_of(loop)]
    drawn = [image(picture(), phase_of(frame)) for frame in (0, 5, 10, 15, 20)]
    still = np.all([np.array_equal(d, drawn[0]) or (d == drawn[0]).all(axis=2) for d in drawn[1:]], axis=0)
    still[: int(360 * 0.78)] &= np.indices((360, 480))[0][: int(360 * 0.78)] < 45  # rulers and bar
    still[int(360 * 0.78) :, 400:] = False  # the gauge moves
    assert still.sum() > 10_000
    for pixels in others:
        assert np.array_equal(pixels[still], first[still])


def test_flat_colours_stay_exact(loop):
    tokens = THEMES["light"]
    pixels = frames_of(loop)[5][1]
    for place, colour in (((150, 2), tokens.background), ((355, 5), tokens.band)):
        assert pixels[place].tolist() == [round(255 * part) for part in rgb(colour)]


def test_the_palette_is_better_than_its_first_guess():
    images = [image(picture(), phase_of(frame)) for frame in (0, 5, 10)]
    guess = Image.fromarray(np.concatenate(images)).quantize(256, method=Image.Quantize.FASTOCTREE, dither=0)
    other = image(picture(), phase_of(7))

    def error(shown):
        return np.linalg.norm(to_oklab(other.reshape(-1, 3) / 255) - to_oklab(shown.reshape(-1, 3) / 255), axis=1)

    first = error(np.asarray(Image.fromarray(other).quantize(palette=guess, dither=0).convert("RGB")))
    ours = error(np.asarray(SharedPalette(images).index(other).convert("RGB")))
    assert np.percentile(ours, 99) < 0.8 * np.percentile(first, 99)
    assert ours.mean() < 0.8 * first.mean()


def test_small_things_keep_their_colour():
    # a coloured mark of a few pixels must not be merged into its surroundings
    frame = np.full((200, 300, 3), 247, np.uint8)
    frame[50:150, 50:250] = np.linspace(40, 220, 200).astype(np.uint8)[None, :, None]
    frame[20:24, 20:24] = (163, 21, 111)
    shown = np.asarray(SharedPalette([frame]).index(frame).convert("RGB")).astype(int)
    assert np.abs(shown[21, 21] - [163, 21, 111]).max() <= 8


def test_a_loop_in_which_nothing_moves_still_lasts_a_cycle(tmp_path):
    still = body()
    still = Body("still", still.mesh, np.zeros_like(still.shape), 0.0, 1.0)
    path = save_gif(picture(still, ghost=False), tmp_path / "still.gif")
    assert duration(path) == 1600


def test_equal_neighbours_keep_their_time(tmp_path):
    images = [np.full((20, 20, 3), value, np.uint8) for value in (0, 0, 0, 200, 200, 0)]
    palette = SharedPalette(images)
    write_loop([palette.index(held) for held in images], tmp_path / "a.gif")
    assert duration(tmp_path / "a.gif") == 240
    shown = frames_of(tmp_path / "a.gif")
    at = lambda ms: next(pixels for clock, pixels in shown if ms < clock)[0, 0, 0]  # noqa: E731
    assert [int(at(ms)) > 100 for ms in (20, 60, 100, 140, 180, 220)] == [False, False, False, True, True, False]


def test_progress_ticks_every_frame_and_cancelling_leaves_nothing(tmp_path):
    ticks = []

    def stop():
        return len(ticks) >= 8

    sink = Progress(show=lambda stage, done, total: ticks.append((done, total)), stop=stop)
    with pytest.raises(Cancelled):
        save_gif(picture(), tmp_path / "loop.gif", sink)
    assert ticks == [(done, 21) for done in range(8)]
    assert not list(tmp_path.iterdir())

"""Stills and render requests."""

import pickle

import numpy as np
import pytest
from PIL import Image

from tests.stage.channel import picture
from viewer.errors import Cancelled, ExportError
from viewer.export import RenderRequest, image, save_png
from viewer.jobs import Progress


def test_png_holds_the_picture(tmp_path):
    path = save_png(picture(), tmp_path / "new" / "still.png", phase=0.5)
    with Image.open(path) as held:
        assert held.format == "PNG"
        assert np.array_equal(np.asarray(held), image(picture(), 0.5))
    assert [p.name for p in path.parent.iterdir()] == ["still.png"]


def test_cancelled_still_leaves_nothing(tmp_path):
    with pytest.raises(Cancelled):
        save_png(picture(), tmp_path / "still.png", progress=Progress(stop=lambda: True))
    assert not list(tmp_path.iterdir())


def test_place_that_cannot_be_written(tmp_path):
    (tmp_path / "file").write_text("not a folder")
    with pytest.raises(ExportError, match="cannot be written"):
        save_png(picture(), tmp_path / "file" / "still.png")


def test_request_survives_pickling(tmp_path):
    request = pickle.loads(pickle.dumps(RenderRequest(picture(), "png", tmp_path / "a.png", phase=1.0)))
    assert request.write() == tmp_path / "a.png"
    with Image.open(tmp_path / "a.png") as held:
        assert np.array_equal(np.asarray(held), image(picture(), 1.0))


def test_request_in_a_child_process(tmp_path):
    path = RenderRequest(picture(), "png", tmp_path / "a.png").write_in_child()
    with Image.open(path) as held:
        assert np.array_equal(np.asarray(held), image(picture(), 0.0))


def test_unknown_kind_is_refused(tmp_path):
    with pytest.raises(ExportError, match="one of: gif, mp4, png, strip"):
        RenderRequest(picture(), "film", tmp_path / "a")

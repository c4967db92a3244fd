"""Model files: every refusal says where, what was found and what to write."""

import pickle

import pytest
from gas_reference import HEAD, write_model

from haloledger.errors import InputError
from haloledger.gas.models import load_model, model_names
from haloledger.gas.projection import projection

SHAPE = '[shape]\nkind = "modified-nfw"\ninner_slope = 2.0\ninner_offset = 2.0\n'
KEPT = '[kept]\nlaw = "constant"\nkept = 0.75\n'
MIXED = "[[component]]\n" + SHAPE.replace("[shape", "[component.shape") + KEPT.replace("[kept", "[component.kept")
HANDOVER = "[handover]\nlog_m200c = [13.0]\nwidth_dex = [0.2]\n"


@pytest.mark.parametrize(
    ("name", "message"),
    [
        ("textbook-modified-nwf", "no model 'textbook-modified-nwf'. Did you mean 'textbook-modified-nfw'"),
        ("xyzzy", "no model 'xyzzy'. Models: blended, gnfw"),
        ("nowhere/mine.toml", "no file nowhere/mine.toml. Write the path of a model file, or one of blended"),
    ],
)
def test_unknown_models(name, message):
    with pytest.raises(InputError, match=message):
        load_model(name)


@pytest.mark.parametrize(
    ("body", "message"),
    [
        (SHAPE + KEPT + "[spred]\nx = 1\n", "mine.toml: unknown key 'spred'. Did you mean 'spread'"),
        (
            SHAPE.replace("inner_offset", "y0") + KEPT,
            "in shape: unknown key 'y0'. Known: kind, inner_slope, inner_offset, core",
        ),
        (SHAPE.replace("inner_offset", "inner_ofset") + KEPT, "unknown key 'inner_ofset'. Did you mean 'inner_offset'"),
        (
            SHAPE.replace("inner_offset = 2.0\n", "") + KEPT,
            "in shape: missing key 'inner_offset'. Write inner_offset =",
        ),
        (
            SHAPE.replace("modified-nfw", "modifed-nfw") + KEPT,
            "kind = 'modifed-nfw' is not known. Did you mean 'modified-nfw'",
        ),
        (SHAPE.replace("2.0", '"two"', 1) + KEPT, "shape.inner_slope = 'two'. Write a number"),
        (SHAPE.replace("2.0", "[2.0]", 1) + KEPT, r"shape.inner_slope = \[2.0\]. Write one value"),
        (SHAPE.replace("2.0", "9.0", 1) + KEPT, "inner_slope = 9.0 is outside 0..4; the usual value is 2"),
        (SHAPE.replace("2.0", "0.0", 1) + KEPT, "infinite column at the centre; add core = 0.01"),
        (
            '[shape]\nkind = "nfw"\ncore = 0.0\n' + KEPT,
            "core = 0.0 is outside 0.001..1 .*without a core the column diverges",
        ),
        (SHAPE, r"no \[kept\]. Write a table \[kept\] with law = one of constant, power-law"),
        (KEPT, r"no \[shape\]. Write a table \[shape\] with kind = one of modified-nfw"),
        (SHAPE + KEPT.replace("0.75", "75"), "kept = 75.0 must be a fraction above 0 and not above 2"),
        (SHAPE + KEPT.replace("constant", "constnat"), "law = 'constnat' is not known. Did you mean 'constant'"),
        (SHAPE + KEPT + 'radius = "r180m"\n', "kept.radius = 'r180m'. Write one of r500c, r200c, boundary"),
        (
            SHAPE + KEPT + "[spread]\nshared_dex = 3\nown_dex = 0.1\n",
            "spread.shared_dex = 3. Write values in dex between 0 and",
        ),
        (
            SHAPE + KEPT + "[spread]\nshared_dex = [0.1, 0.2]\nown_dex = 0.1\n",
            "shared_dex has 2 values and log_m200c 1",
        ),
        (SHAPE + KEPT + HANDOVER, r"\[handover\] needs two or more \[\[component\]\]"),
        (MIXED, r"a mixture needs two or more \[\[component\]\] tables, from low to high mass"),
        (SHAPE + KEPT + MIXED * 2 + HANDOVER, r"\[shape\] and \[kept\] beside \[\[component\]\]"),
        (MIXED * 3 + HANDOVER, r"handover of 3 components: log_m200c = \[13.0\].* Write lists of 2"),
        (SHAPE + KEPT + "x = [", "mine.toml: not TOML"),
    ],
)
def test_faulty_files(body, message, tmp_path):
    with pytest.raises(InputError, match=message):
        write_model(tmp_path, body)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('status = "scenario"', 'status = "true"', "status = 'true'. Write one of published, scenario"),
        ('phases = "hot"', 'phases = "warm"', r"phases = 'warm'. Write one of hot, hot\+cool"),
        ("boundary = 1.0", "boundary = 250.0", "boundary = 250.0. Write one number from 0.3 to 3.0"),
        ('"dutton2014"', '"duton2014"', "concentration = 'duton2014'. Did you mean 'dutton2014'"),
        (
            "log_m200c = [10.0, 15.5]",
            "log_m200c = [15.5, 10.0]",
            r"validity.log_m200c = \[15.5, 10.0\]. Write \[lowest, highest\]",
        ),
        ('summary = "For a test."\n', "", "missing key 'summary'"),
        ('source = "none"\n', "", "missing key 'source'"),
    ],
)
def test_faulty_heads(old, new, message, tmp_path):
    text = HEAD.format(name="mine", boundary=1.0) + SHAPE + KEPT
    assert old in text
    (tmp_path / "mine.toml").write_text(text.replace(old, new))
    with pytest.raises(InputError, match=message):
        load_model(str(tmp_path / "mine.toml"))


def test_kept_with_an_absolute_shape(tmp_path):
    body = '[shape]\nkind = "gnfw-fit"\nscale = 0.5\namplitude = [4e3, 0, 0]\n'
    body += "sharpness = [0.9, 0, 0]\nouter = [3.8, 0, 0]\n"
    with pytest.raises(InputError, match=r"\[kept\] with the absolute shape 'gnfw-fit'. Leave \[kept\] out"):
        write_model(tmp_path, body + "inner = -0.2\n" + KEPT)


def test_a_number_for_the_concentration_and_plain_source(tmp_path):
    model = write_model(tmp_path, SHAPE + KEPT)
    assert model.source == "none"
    path = tmp_path / "mine.toml"
    path.write_text(path.read_text().replace('"dutton2014"', "7"))
    assert load_model(str(path)).concentration == 7.0


def test_spread_over_mass(tmp_path):
    body = "[spread]\nlog_m200c = [12.0, 14.0]\nshared_dex = [0.2, 0.0]\nown_dex = [0.1, 0.3]\n"
    scatter = "b_over_r200c = [0.0, 1.0]\nshape_scatter_dex = [0.1, 0.3]\n"
    model = write_model(tmp_path, SHAPE + KEPT + body + scatter)
    assert (model.spread_shared_dex, model.spread_own_dex) == (0.2, 0.3)
    assert (model.spread.log_m200c, model.spread.own_dex) == ((12.0, 14.0), (0.1, 0.3))
    assert model.shape_scatter_dex([0.5, 2.0]) == pytest.approx([0.2, 0.3])


def test_models_travel_to_another_process(planck):
    for name in model_names():
        model = load_model(name)
        again = pickle.loads(pickle.dumps(model))
        assert again == model
        assert hash(again) == hash(model)
        assert projection(again, planck) is projection(model, planck)


def test_outside_validity():
    model = load_model("gnfw-agn-feedback")
    assert list(model.outside_validity([13.0, 14.0, 14.0], [0.1, 0.1, 2.0])) == [True, False, True]

from pathlib import Path

import numpy as np
import pytest
from survey_examples import RECIPES, text_of

import vortexwidgets.survey
from vortexwidgets.survey.reading import example_survey
from vortexwidgets.survey.screening import screen
from vortexwidgets.survey.survey import SurveyError

FOLDER = Path(vortexwidgets.survey.__file__).parent / "examples"


@pytest.mark.parametrize("name", RECIPES)
def test_the_built_in_files_are_what_the_script_makes(name):
    assert (FOLDER / f"{name}.csv").read_text(encoding="utf-8") == text_of(name)


@pytest.mark.parametrize("name", RECIPES)
def test_a_built_in_survey_says_that_it_is_invented_and_screens_clean(name):
    survey, recipe = example_survey(name), RECIPES[name]
    assert "invented" in survey.facts["title"]
    found = screen(survey, centre=recipe.centre, peak_radius=1.1209 * recipe.core_radius)
    assert found.outliers == ()
    assert found.sentences == ()
    assert found.inside_core > 5
    np.testing.assert_allclose(survey.uncertainty, recipe.noise)


def test_an_unknown_example_is_answered_with_the_known_ones():
    with pytest.raises(
        SurveyError, match=r"no built-in survey is named 'wingtip'; known: pump-intake, whirlwind, wing"
    ):
        example_survey("wingtip")

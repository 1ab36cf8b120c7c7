"""Remedies hold: applied, the finding is gone and none is new; the next weaker one does not do."""

from __future__ import annotations

import pytest

from tests.support.cures import Cure, cures
from tests.support.desk import found

CURES = list(cures())


@pytest.mark.parametrize("cure", CURES, ids=str)
def test_the_remedy_mends_it_and_nothing_less_does(cure: Cure) -> None:
    before = found(cure.job.review())
    (ill, *_) = [one for one in before if one.check == cure.check]
    assert ill.remedy is not None
    after = cure.fit(cure.job, ill.remedy).review()
    known = {(one.check, one.parts) for one in before} - {(ill.check, ill.parts)}
    assert [(one.check, one.message) for one in found(after) if (one.check, one.parts) not in known] == []
    assert [one.solution.not_solved for one in after.limiters] == [None]
    if cure.weaker is not None:
        assert cure.check in {one.check for one in found(cure.weaker(cure.job, ill.remedy).review())}, ill.remedy

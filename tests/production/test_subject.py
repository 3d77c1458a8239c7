from wavegen.production.subject import Subject


def test_a_subject_is_a_plain_recording_unless_more_is_said(lab):
    subject = Subject(name="x", signal=lab.held(lab.CARRIER), loops=False)
    assert not (subject.is_described)
    assert not (subject.is_power)
    assert not (subject.is_real)
    assert not (subject.every_loop)
    assert subject.bursts is subject.symbols is subject.bench is None

from wavegen.core.progress import Progress, silent


def test_silence_takes_what_every_listener_takes():
    listener: Progress = silent
    assert listener("render", 0, 10) is None


def test_any_callable_of_that_form_listens():
    told = []

    def listen(task: str, done: int, total: int) -> None:
        told.append((task, done, total))

    listener: Progress = listen
    listener("render", 5, 10)
    assert told == [("render", 5, 10)]

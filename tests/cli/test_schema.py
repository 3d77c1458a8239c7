from jsonschema import Draft202012Validator


def test_one_document_with_and_without_json(call):
    said = call("schema")
    assert said.status == 0
    assert said.err == ""
    document = said.json()
    Draft202012Validator.check_schema(document)
    assert document == call("schema", "--json").json()
    assert "sample_rate" in document["properties"]


def test_nothing_more_is_taken(call):
    assert call("schema", "x").status == 2

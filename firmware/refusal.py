"""A command that is not carried out, and why: raised by whoever finds out, answered by dispatch."""


class Refusal(Exception):
    """Refusal code of the wire, its detail and the limit field it is about."""

    def __init__(self, code, detail=0, field=0):
        self.code = code
        self.detail = detail
        self.field = field

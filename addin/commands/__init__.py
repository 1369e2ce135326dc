"""The commands of ``thrustbook``, one module each: ``configure(parser)`` and ``run(options) -> exit status``."""

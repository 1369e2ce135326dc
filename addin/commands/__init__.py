"""The commands of ``thrustbook``, a module each: ``configure(parser)``, ``run(options) -> exit status``."""

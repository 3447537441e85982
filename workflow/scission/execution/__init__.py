"""Running a plan: supervised calculations, jobs of the engine, and the run of a whole campaign.

``worker`` does what one job of the engine asks for; ``guard`` runs each calculation in a child process
under time and memory budgets, so that a calculation that hangs, grows, raises or is killed becomes a
record with a status and a reason.  Only the child (``child``) ever imports chemistry.  ``planning``,
``engine``, ``runfile`` and ``progress`` serve the command that runs a whole campaign.
"""

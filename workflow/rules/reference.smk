if not SALVAGE:

    rule reference:
        """References of whole scans, carried from geometry to geometry, and the points that need no more."""
        input:
            needed,
        output:
            "jobs/{job}.json",
        log:
            "logs/{job}.log",
        benchmark:
            "benchmarks/{job}.tsv"
        wildcard_constraints:
            job=r"reference\..+",
        resources:
            mem_mb=memory,
            runtime=runtime,
            attempt=lambda wildcards, attempt: attempt,
        params:
            physics_version=PLAN["physics_version"],
            attempts=ATTEMPTS,
        shell:
            WORKER

if not SALVAGE:

    rule correlate:
        """A block of points on top of their references."""
        input:
            needed,
        output:
            "jobs/{job}.json",
        log:
            "logs/{job}.log",
        benchmark:
            "benchmarks/{job}.tsv"
        wildcard_constraints:
            job=r"correlate\..+",
        resources:
            mem_mb=memory,
            runtime=runtime,
            attempt=lambda wildcards, attempt: attempt,
        params:
            physics_version=PLAN["physics_version"],
            attempts=ATTEMPTS,
        shell:
            WORKER

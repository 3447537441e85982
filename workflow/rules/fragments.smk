if not SALVAGE:

    rule fragments:
        """The separate fragments that the broken bonds of a scan leave, at each level."""
        input:
            needed,
        output:
            "jobs/{job}.json",
        log:
            "logs/{job}.log",
        benchmark:
            "benchmarks/{job}.tsv"
        wildcard_constraints:
            job=r"fragments\..+",
        resources:
            mem_mb=memory,
            runtime=runtime,
            attempt=lambda wildcards, attempt: attempt,
        params:
            physics_version=PLAN["physics_version"],
            attempts=ATTEMPTS,
        shell:
            WORKER

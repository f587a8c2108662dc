# SPDX-License-Identifier: Apache-2.0
# compare_estimate.py ESTIMATE.json RUN.json: what `rille check --json` announced against what the
# run needed. Counts that the case states must be equal, the others within a factor of two.
import json, sys

estimate, run = (json.load(open(path)) for path in sys.argv[1:3])
numerics = run["numerics"]


def within_two(announced, needed):
    return 0.5 <= announced / needed <= 2


pairs = {
    "memory": (estimate["memory_MB"], run["machine"]["peak_memory_bytes"] / 1e6),
    "voxels": (estimate["voxels"], numerics["voxels"]),
    "surface elements": (estimate["surface_elements"], numerics["surface_elements"]),
    "refreshes": (estimate["refreshes"], numerics["refreshes"]),
    "process time": (estimate["process_time_s"], run["simulated_s"]),
}
for name, (announced, needed) in pairs.items():
    print("%s: %.4g announced, %.4g needed" % (name, announced, needed))
    if not within_two(announced, needed):
        sys.exit("FAILED: the estimate of " + name)
if estimate["rays_per_element"] != numerics["rays_per_element"]:
    sys.exit("FAILED: rays per element")
if estimate["spacing_nm"] != numerics["spacing_nm"]:
    sys.exit("FAILED: spacing")
# The fault: an estimate for half the size of everything must not pass.
announced, needed = pairs["surface elements"]
if within_two(0.45 * announced, needed) and within_two(2.2 * announced, needed):
    sys.exit("FAILED: any estimate would pass")
print("expected time: %.3g s announced, %.3g s taken (not checked)"
      % (estimate["wall_time_s"], run["machine"]["wall_seconds"]))

"""The Magellanic Clouds stay in the list when a catalogue has other galaxies at their velocity."""

import sky

from haloledger.audit import audit

LMC = (80.894, -69.756)


def test_a_line_through_the_cloud_meets_its_disc_whatever_is_listed_beside():
    line = sky.bursts({"burst": "B", "ra": LMC[0], "dec": LMC[1], "z": 0.3, "dm": 500.0})
    # a galaxy of the Cloud's velocity, ten degrees away and a hundred times as far
    other = {"id": "G", "ra": 100.0, "dec": -62.0, "z": 0.0009, "log_mstar": 9.3, "distance_mpc": 4.6}
    alone, beside = (
        audit(line, galaxies=g, models=["textbook-modified-nfw"], draws=100).to_pandas()[1]
        for g in ([], [sky.galaxies(other)])
    )
    for entries in (alone, beside):
        cloud = entries[entries.halo == "local:LMC"]
        assert len(cloud) == 1
        assert cloud.dm_disc_crossing_p50.iloc[0] > 20

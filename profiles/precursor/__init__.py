"""Monthly series become lead times, a hindcast score and an outlook, with the statistics done right."""

from profiles.precursor.anomaly import Anomaly, anomalies, fit_anomaly, running_mean
from profiles.precursor.series import monthly_series, overlap

__all__ = ["Anomaly", "anomalies", "fit_anomaly", "monthly_series", "overlap", "running_mean"]

using Stacks.Abstractions;

namespace Stacks.Pipeline;

/// <summary>Which keys go together in a noise table.</summary>
internal static class NoiseRules
{
    /// <summary>Refuses tables that lack a key their origin needs, or give one it does not use.</summary>
    /// <exception cref="RecipeException">With the place of the key.</exception>
    public static void Check(NoiseSection section, TableReader table)
    {
        switch (section.From)
        {
            case NoiseOrigin.Values when section.Sigma is not null:
                Refuse(table, "sigma stands for the whole model", "gain", "read_noise", "pedestal", "file");
                break;
            case NoiseOrigin.Values:
                Refuse(table, "from = \"values\" reads no file", "file");
                Require(table, "gain", "gain in e-/ADU, or sigma instead of gain, read_noise and pedestal");
                Require(table, "read_noise", "read_noise in e-");
                Require(table, "pedestal", "pedestal, the level without light in ADU: a missing pedestal is not zero");
                break;
            case NoiseOrigin.Header:
                Refuse(table, "from = \"header\" takes gain and read noise; only gain, read_noise and pedestal may stand beside it", "sigma", "file");
                break;
            case NoiseOrigin.Frame:
                Refuse(table, "from = \"frame\" measures a constant sigma", "gain", "read_noise", "pedestal", "sigma", "file");
                break;
            default:
                throw table.Error("from", "noise files of a survey cannot be used yet", "give from = \"values\" with gain, read_noise and pedestal, \"header\" or \"frame\"");
        }
    }

    private static void Require(TableReader table, string key, string remedy)
    {
        if (!table.Has(key))
            throw new RecipeException(table.Place.ToString(), $"from = \"values\" needs {key}", "add " + remedy);
    }

    private static void Refuse(TableReader table, string reason, params string[] keys)
    {
        foreach (string key in keys)
        {
            if (table.Has(key))
                throw table.Error(key, $"{key} does not belong here: {reason}", $"remove {key}, or change from");
        }
    }
}

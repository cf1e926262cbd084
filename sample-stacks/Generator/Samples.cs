namespace Stacks.SampleStacks;

/// <summary>All sample stacks.</summary>
internal static class Samples
{
    /// <summary>Writes every stack and truth table into a folder; each has a random stream of its own.</summary>
    public static void WriteAll(string folder)
    {
        NightField.Write(folder);
        WanderingCells.Write(folder);
        FourChips.Write(folder);
    }
}
